/** One folder for everything that tests put into the system's temporary folder, and for the key that seals their
 *  books; it goes when they end. */

import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';

export default function setup(): () => void {
  const folder = mkdtempSync(join(tmpdir(), 'platebook-tests-'));
  process.env.TMPDIR = folder;
  process.env.PLATEBOOK_KEY = join(folder, 'key.pem');
  return () => rmSync(folder, { recursive: true, force: true });
}
