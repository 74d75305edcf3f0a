/** The proof document, checked by ourselves and by the two scripts that stand alone. */

import { spawnSync } from 'node:child_process';
import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { leafHash } from '../../ledger/merkle.ts';
import { checkProof, type ProofDocument, prove } from '../../ledger/proof.ts';
import { signNote } from '../../ledger/signed-note.ts';
import { readSigningKey } from '../../ledger/signing-key.ts';
import { fillBook } from './lantern-book.ts';
import { keyFile, makeBook, temporary } from './make-book.ts';

const script = (name: string) => fileURLToPath(new URL(`../../ledger/export/${name}`, import.meta.url));
// RFC 8032 section 7.1, TEST 2.
const OTHER_SEED = '4ccd089b28ff96da9db6c346ec114e0f5b8a319f35aba624da8cf6ed4fb8a6fb';

let directory: string;
let remove: () => void;
let proof: ProofDocument;
/** Of a book with the same content and another key. */
let stranger: ProofDocument;

beforeAll(() => {
  ({ directory, remove } = temporary());
  const book = makeBook(join(directory, 'book'), { name: 'lantern, 1.3 mm + 3 mm' });
  fillBook(book);
  proof = prove(book, 9);
  book.close();
  const other = makeBook(join(directory, 'other'), {
    name: 'lantern, 1.3 mm + 3 mm',
    key: keyFile(directory, OTHER_SEED),
  });
  fillBook(other);
  stranger = prove(other, 9);
  other.close();
});

afterAll(() => remove());

test('has the fields that are promised, and no others', () => {
  expect(Object.keys(proof)).toEqual(['entry', 'index', 'size', 'inclusion', 'checkpoint', 'key']);
  expect(proof).toMatchObject({ index: 8, size: 16 });
  // ceil(log2 16)
  expect(proof.inclusion).toHaveLength(4);
  expect(JSON.stringify(proof).length).toBeLessThan(3000);
});

const flip = (text: string, at: number) =>
  text.slice(0, at) + (text[at] === 'A' ? 'B' : 'A') + text.slice(at + 1);
const spoiled: [string, (proof: ProofDocument) => object][] = [
  ['another entry', ({ entry }) => ({ entry: entry.replace('"number":9', '"number":8') })],
  ['an entry with a changed digit', ({ entry }) => ({ entry: entry.replace('"bytes":17', '"bytes":18') })],
  ['an entry with a blank more', ({ entry }) => ({ entry: `${entry} ` })],
  ['another index', () => ({ index: 7 })],
  ['an index beyond the size', () => ({ index: 16 })],
  ['a negative index', () => ({ index: -1 })],
  ['another size', () => ({ size: 17 })],
  ['a hash less', ({ inclusion }) => ({ inclusion: inclusion.slice(1) })],
  ['a hash more', ({ inclusion }) => ({ inclusion: [...inclusion, inclusion[0]] })],
  [
    'a changed hash',
    ({ inclusion }) => ({ inclusion: [flip(inclusion[0] ?? '', 3), ...inclusion.slice(1)] }),
  ],
  ['hashes exchanged', ({ inclusion }) => ({ inclusion: [...inclusion].reverse() })],
  ['a hash that is none', ({ inclusion }) => ({ inclusion: ['AAAA', ...inclusion.slice(1)] })],
  ['a changed root', ({ checkpoint }) => ({ checkpoint: checkpoint.replace(/\n(.)(.{42}=)\n/, '\nQ$2\n') })],
  ['a changed time', ({ checkpoint }) => ({ checkpoint: checkpoint.replace('time 2026', 'time 2025') })],
  ['another book', ({ checkpoint }) => ({ checkpoint: checkpoint.replace('lantern', 'lanterm') })],
  ['a changed signature', ({ checkpoint }) => ({ checkpoint: flip(checkpoint, checkpoint.length - 30) })],
  ['no signature', ({ checkpoint }) => ({ checkpoint: checkpoint.split('—')[0] })],
  ['another key', () => ({ key: stranger.key })],
  ['a key whose hash is wrong', ({ key }) => ({ key: key.replace(/\+([0-9a-f]{8})\+/, '+00000000+') })],
  ['no key', () => ({ key: '' })],
  [
    'base64 with bits to spare',
    ({ inclusion }) => ({ inclusion: inclusion.map((each) => each.replace(/.=$/, '/=')) }),
  ],
];

/** A seal that its own signer has given a wrong root: of sixteen entries, and the hash of one. */
function sealOverOne({ entry, checkpoint }: ProofDocument): Partial<ProofDocument> {
  const root = leafHash(Buffer.from(entry)).toString('base64');
  const text = checkpoint.slice(0, checkpoint.indexOf('\n\n') + 1).replace(/\n.{43}=\n/, `\n${root}\n`);
  const key = readSigningKey(keyFile(directory));
  return { inclusion: [], checkpoint: signNote(text, text.split('\n')[0] ?? '', key) };
}
spoiled.push(['a seal over more entries than the path goes through', sealOverOne]);

describe.each<[string, (file: string, key?: string) => { holds: boolean; said: string }]>([
  [
    'checkProof',
    (file, key) => {
      try {
        return { holds: true, said: JSON.stringify(checkProof(JSON.parse(readFileSync(file, 'utf8')), key)) };
      } catch (error) {
        return { holds: false, said: (error as Error).message };
      }
    },
  ],
  ['check-proof.mjs', (file, key) => run(process.execPath, script('check-proof.mjs'), file, key)],
  ['check-proof.py', (file, key) => run('python3', script('check-proof.py'), file, key)],
])('%s', (name, check) => {
  const written = (document: object) => {
    const file = join(directory, `${name}.json`);
    writeFileSync(file, JSON.stringify(document));
    return file;
  };

  test('accepts the proof, with and without a key from elsewhere', () => {
    for (const key of [undefined, proof.key]) {
      const { holds, said } = check(written(proof), key);
      expect([holds, said]).toEqual([true, said]);
      expect(said).toContain('lantern, 1.3 mm + 3 mm');
    }
    expect(check(written(stranger)).holds).toBe(true);
  });

  test('refuses a proof by a stranger when the key is known', () => {
    const { holds, said } = check(written(stranger), proof.key);
    expect([holds, said]).toEqual([false, expect.stringContaining('another key')]);
  });

  test.each(spoiled)('refuses %s', (_, spoil) => {
    const document = { ...proof, ...spoil(proof) };
    expect(document).not.toEqual(proof);
    const { holds, said } = check(written(document));
    expect([holds, said]).toEqual([
      false,
      expect.stringMatching(/^(does not hold: |The proof does not hold: )./),
    ]);
  });
});

function run(program: string, ...words: (string | undefined)[]): { holds: boolean; said: string } {
  const given = words.filter((word) => word !== undefined);
  const { status, stdout, stderr } = spawnSync(program, given, { encoding: 'utf8', env: {}, cwd: '/' });
  if (stderr !== '') throw new Error(stderr);
  return { holds: status === 0, said: stdout };
}

test.each(['check-proof.mjs', 'check-proof.py'])(
  '%s has fewer than 100 lines and needs nothing of ours',
  (name) => {
    const text = readFileSync(script(name), 'utf8');
    expect(text.split('\n').length - 1).toBeLessThan(100);
    const imported = [...text.matchAll(/^import (?:.* from '(.*)'|(.*));?$/gm)].map(
      ([, node, python]) => node ?? python,
    );
    expect(imported).toEqual(
      name.endsWith('.py') ? ['base64, hashlib, json, sys, urllib.parse'] : ['node:crypto', 'node:fs'],
    );
  },
);
