/** Bags that somebody tampered with, or made to do harm: each is refused whole. */

import { execFileSync } from 'node:child_process';
import {
  cpSync,
  mkdirSync,
  readFileSync,
  renameSync,
  rmSync,
  symlinkSync,
  truncateSync,
  writeFileSync,
} from 'node:fs';
import { join } from 'node:path';
import fc from 'fast-check';
import { beforeAll, describe, expect, it } from 'vitest';
import { canonicalJson } from '../../../ledger/canonical.ts';
import { document, platebook } from '../test-io.ts';
import { temporaryFolder } from '../test-jobs.ts';
import { copyOf, edit, filesBelow, refusal, reseal, resealTags, tinyBook } from './tiny-book.ts';

let bag = '';

beforeAll(async () => {
  const folder = await tinyBook();
  bag = join(folder, 'bag');
  await document(folder, ['bag', 'run', '1', '--to', bag]);
});

describe('a bag that was damaged', () => {
  it('is refused for every byte that is flipped, file that is cut, removed, renamed or added', () => {
    const copy = copyOf(bag);
    const files = filesBelow(copy);
    // Small files too often stand back behind the code: every third draw is one of those at the top.
    const top = files.filter((path) => !path.startsWith('data/'));
    const file = fc.oneof(
      { weight: 2, arbitrary: fc.constantFrom(...files) },
      { weight: 1, arbitrary: fc.constantFrom(...top) },
    );
    const deed = fc.constantFrom('flip', 'flip', 'flip', 'cut', 'remove', 'rename', 'add');
    fc.assert(
      fc.property(file, deed, fc.nat(), fc.integer({ min: 0, max: 7 }), (path, what, at, bit) => {
        const place = join(copy, path);
        const bytes = readFileSync(place);
        const changed = Buffer.from(bytes);
        if (what === 'flip') {
          changed[at % bytes.length] = (bytes[at % bytes.length] ?? 0) ^ (1 << bit);
          writeFileSync(place, changed);
        }
        if (what === 'cut') truncateSync(place, at % bytes.length);
        if (what === 'remove') rmSync(place);
        if (what === 'rename') renameSync(place, `${place}.old`);
        if (what === 'add') writeFileSync(`${place}.new`, bytes);
        expect(refusal(copy), `${what} ${path} ${at} ${bit}`).not.toBe('');
        for (const more of ['.old', '.new']) rmSync(`${place}${more}`, { force: true });
        writeFileSync(place, bytes);
      }),
      { numRuns: 120, seed: 8493 },
    );
    expect(refusal(copy)).toBe('');
  });

  it('is refused although its manifests are made anew', () => {
    const told = (change: (copy: string) => void) => {
      const copy = copyOf(bag);
      change(copy);
      reseal(copy);
      return refusal(copy);
    };
    const output = filesBelow(bag).find((path) => /outputs\/\d-library\/manifest/.test(path)) ?? '';
    expect(told((copy) => edit(copy, output, (text) => text.replace('1', '2')))).toMatch(
      /^data\/entries\/\d\.json: expected all that it names in the bag, got the store has no output manifest of \d+ bytes/,
    );
    expect(
      told((copy) =>
        edit(copy, 'data/entries/1.json', (text) => text.replace('"book":"book"', '"book":"hook"')),
      ),
    ).toContain('data/entries: expected entries of one book, got entries of "hook", "book".');
    expect(told((copy) => edit(copy, 'data/entries/1.json', (text) => `${text} `))).toContain(
      'data/entries/1.json: expected an entry in canonical JSON, got',
    );
    expect(
      told((copy) =>
        edit(copy, 'data/entries/2.json', (text) => text.replace(/"before":"../, '"before":"00')),
      ),
    ).toContain('data/entries/2.json: expected the digest of the entry before it, ');
    // The last entry is held by nothing but its proof.
    expect(
      told((copy) => edit(copy, 'data/entries/4.json', (text) => text.replace('"A. Tester"', '"B. Tester"'))),
    ).toContain('data/proofs/4.json: expected entry 4 as it is in the bag, got another.');
    expect(told((copy) => rmSync(join(copy, 'data', 'entries', '3.json')))).toContain(
      'data/entries/4.json: expected all that it names in the bag, got plate image names entry 3',
    );
    expect(told((copy) => rmSync(join(copy, 'data', 'proofs', '3.json')))).toContain(
      'data/proofs/3.json: expected the proof of entry 3, got none.',
    );
    expect(told((copy) => rmSync(join(copy, 'data', 'seal.txt')))).toContain(
      'data/seal.txt: expected the seal',
    );
    expect(
      told((copy) => renameSync(join(copy, 'data/entries/4.json'), join(copy, 'data/entries/5.json'))),
    ).toContain('data/entries/5.json: expected the entry of this number, got entry 4.');
    expect(
      told((copy) => edit(copy, 'bag-info.txt', (text) => text.replace(/(Platebook-Entry): .*/, '$1: 9'))),
    ).toContain('bag-info.txt: expected one Platebook-Entry, the number of an entry in the bag, got 9.');
  });

  it('is refused when entry, proof and manifests are all made anew without the key', () => {
    const copy = copyOf(bag);
    const change = (text: string) => text.replace('"A. Tester"', '"B. Tester"');
    edit(copy, 'data/entries/4.json', change);
    edit(copy, 'data/proofs/4.json', (text) => {
      const proof = JSON.parse(text);
      return JSON.stringify({ ...proof, entry: change(proof.entry) });
    });
    reseal(copy);
    expect(refusal(copy)).toContain(
      'data/proofs/4.json: expected a proof that holds, got The proof does not hold: the entry is not under the seal',
    );
  });

  it('is refused when the record of its code is not what its digest says', () => {
    const copy = copyOf(bag);
    edit(copy, 'data/entries/1.json', (text) => {
      const entry = JSON.parse(text);
      entry.code.files['stages/bytes.ts'] = 'a'.repeat(64);
      return canonicalJson(entry);
    });
    reseal(copy);
    expect(refusal(copy)).toMatch(
      /^data\/entries\/1\.json: expected code with digest [0-9a-f]{64}, got a list of code with digest/,
    );
  });
});

describe('a bag that climbs out of its directory', () => {
  const withLine = (line: string): string => {
    const copy = copyOf(bag);
    edit(copy, 'manifest-sha256.txt', (text) => text + line);
    resealTags(copy);
    return refusal(copy);
  };
  const digest = 'e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855';

  it('by a name is refused before a file of it is read', () => {
    const last = readFileSync(join(bag, 'manifest-sha256.txt'), 'utf8').trimEnd().split('\n').length + 1;
    const refused = (name: string, what: string) =>
      expect(withLine(`${digest}  ${name}\n`)).toBe(
        `manifest-sha256.txt:${last}: expected a path below the bag, got ${what} (${JSON.stringify(name)}). ` +
          'Do not use this bag; take it from whoever made it once more.',
      );
    refused('/etc/passwd', 'an absolute path');
    refused('data/../../../etc/passwd', 'a path with .. in it');
    refused('data\\..\\x', 'a name with "\\\\" in it');
    refused('data/con.txt', 'the name of a device');
    refused('~root/x', 'a name that begins with ~');
    expect(withLine(`${digest}  etc/passwd\n`)).toContain(
      'manifest-sha256.txt: expected only files below data/, got etc/passwd.',
    );
    expect(withLine(`${digest}  data/README.txt\n${digest}  data/readme.TXT\n`)).toContain(
      'names that differ in more than case',
    );
  });

  it('by a link, or to something that is no file, is refused', () => {
    const with_ = (make: (copy: string) => void) => {
      const copy = copyOf(bag);
      make(copy);
      return refusal(copy);
    };
    const link = (copy: string) => {
      rmSync(join(copy, 'data', 'seal.txt'));
      symlinkSync(join(bag, 'data', 'seal.txt'), join(copy, 'data', 'seal.txt'));
    };
    expect(with_(link)).toContain('data/seal.txt: expected a regular file, got a link.');
    expect(with_((copy) => symlinkSync('/etc', join(copy, 'data', 'more')))).toContain(
      'data/more: expected a regular file, got a link.',
    );
    expect(with_((copy) => execFileSync('mkfifo', [join(copy, 'data', 'pipe')]))).toContain(
      'data/pipe: expected a regular file, got something else',
    );
    const linked = join(temporaryFolder(), 'linked');
    symlinkSync(bag, linked);
    expect(refusal(linked)).toContain('expected a bag, a directory with bagit.txt in it, got a link.');
  });

  it('or claims numbers beyond all bounds, is refused at once', () => {
    const copy = copyOf(bag);
    const lines = Array.from({ length: 100_001 }, (_, i) => `${digest}  data/${i}\n`).join('');
    writeFileSync(join(copy, 'manifest-sha256.txt'), lines);
    resealTags(copy);
    expect(refusal(copy)).toContain('manifest-sha256.txt: expected at most 100000 files, got 100001.');
    const oxum = copyOf(bag);
    edit(oxum, 'bag-info.txt', (text) =>
      text.replace(/Payload-Oxum: .*/, 'Payload-Oxum: 99999999999999999999.1'),
    );
    resealTags(oxum);
    expect(refusal(oxum)).toContain(
      'bag-info.txt: expected a Payload-Oxum such as 996.3, got "99999999999999999999.1".',
    );
  });

  it('or whose tag files are not those of RFC 8493, is refused', () => {
    const told = (change: (copy: string) => void) => {
      const copy = copyOf(bag);
      change(copy);
      resealTags(copy);
      return refusal(copy);
    };
    expect(
      told((copy) =>
        writeFileSync(join(copy, 'bagit.txt'), 'BagIt-Version: 0.97\nTag-File-Character-Encoding: UTF-8\n'),
      ),
    ).toContain(
      'bagit.txt: expected "BagIt-Version: 1.0\\nTag-File-Character-Encoding: UTF-8\\n", got something else.',
    );
    expect(told((copy) => edit(copy, 'bagit.txt', (text) => `\ufeff${text}`))).toContain(
      'bagit.txt: expected',
    );
    expect(
      told((copy) => writeFileSync(join(copy, 'bag-info.txt'), Buffer.from([0x41, 0x3a, 0xff, 0x0a]))),
    ).toContain('bag-info.txt: expected UTF-8, got other bytes.');
    expect(
      told((copy) => edit(copy, 'bag-info.txt', (text) => text.replace(/Payload-Oxum.*\n/, ''))),
    ).toContain('bag-info.txt: expected one Payload-Oxum, got 0.');
    expect(told((copy) => writeFileSync(join(copy, 'manifest-md5.txt'), ''))).toContain(
      'manifest-md5.txt: expected manifest-sha256.txt alone, got another manifest.',
    );
    expect(told((copy) => mkdirSync(join(copy, 'data', 'lpt1')))).toContain(
      'data/lpt1: expected names that mean the same everywhere, got the name of a device.',
    );
    expect(
      told((copy) => writeFileSync(join(copy, 'fetch.txt'), 'https://example.org/x 1 data/unlisted\n')),
    ).toContain('fetch.txt: expected only files that manifest-sha256.txt lists, got data/unlisted.');
    expect(
      told((copy) => writeFileSync(join(copy, 'fetch.txt'), 'https://example.org/x 1 ../x\n')),
    ).toContain('fetch.txt:1: expected a path below the bag, got a path with .. in it ("../x").');
  });
});

it('a refused bag changes nothing: no book is started, nothing is computed', async () => {
  const elsewhere = temporaryFolder();
  const copy = join(elsewhere, 'bag');
  cpSync(bag, copy, { recursive: true });
  edit(copy, 'README.txt', (text) => `${text}\nmore`);
  const before = filesBelow(elsewhere);
  for (const words of [
    ['rerun', 'bag'],
    ['rerun', 'bag', '--trust-code'],
    ['bag', 'bag', '--into', 'book'],
  ]) {
    const { status, err, out } = await platebook(elsewhere, words);
    expect([status, out]).toEqual([1, '']);
    expect(err).toMatch(
      /^README\.txt: expected bytes with digest [0-9a-f]{64}, got bytes with digest [0-9a-f]{64}\. Do not use this bag/,
    );
  }
  expect(filesBelow(elsewhere)).toEqual(before);
});
