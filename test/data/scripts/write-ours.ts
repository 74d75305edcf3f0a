/** Writes the files of test/stages/formats/our-files.ts into a directory, for verify-ours.py. */

import { writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { ourFiles } from '../../stages/formats/our-files.ts';

const [, , directory] = process.argv;
if (directory === undefined) throw new Error('which directory?');
for (const [name, make] of Object.entries(ourFiles)) writeFileSync(join(directory, name), make());
