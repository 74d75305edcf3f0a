/** The bag of the whole demonstration: checked by coreutils alone, against RFC 8493, read by general-purpose libraries,
 *  made twice, taken over into another book, and executed again where there is no book. */

import { execFileSync, spawnSync } from 'node:child_process';
import { createHash } from 'node:crypto';
import { existsSync, mkdirSync, mkdtempSync, readdirSync, readFileSync, statSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { beforeAll, describe, expect, test } from 'vitest';
import { platebook } from './small-disk.ts';

const root = dirname(dirname(dirname(fileURLToPath(import.meta.url))));
const recipe = join(root, 'recipes', 'lantern', 'lantern.yaml');
const PYTHON = '/usr/bin/python3';
const folder = mkdtempSync(join(tmpdir(), 'platebook-demonstration-'));
const bag = join(folder, 'bag');
let files: string[] = [];
let said = '';

beforeAll(() => {
  const run = platebook(['run', recipe], folder);
  expect(run).toMatchObject({ status: 0 });
  said = run.out;
  const made = platebook(['bag', 'run', '1', '--to', 'bag'], folder);
  expect(made).toMatchObject({ status: 0 });
  files = filesBelow(bag);
  const bytes = files.reduce((sum, file) => sum + statSync(join(bag, file)).size, 0);
  console.log(`the demonstration's bag: ${files.length} files, ${(bytes / 1e6).toFixed(1)} MB`);
});

function filesBelow(directory: string): string[] {
  return readdirSync(directory, { recursive: true, withFileTypes: true })
    .filter((found) => found.isFile())
    .map((found) => join(found.parentPath, found.name).slice(directory.length + 1))
    .sort();
}

const textOf = (file: string) => readFileSync(join(bag, file), 'utf8');
const digestOf = (path: string) => createHash('sha256').update(readFileSync(path)).digest('hex');

describe('RFC 8493', () => {
  test.each(['manifest-sha256.txt', 'tagmanifest-sha256.txt'])('%s is checked by sha256sum', (manifest) => {
    const checked = spawnSync('sha256sum', ['-c', '--strict', '--quiet', manifest], {
      cwd: bag,
      encoding: 'utf8',
    });
    expect(checked.stdout + checked.stderr).toBe('');
    expect(checked.status).toBe(0);
  });

  // Section 2.1.1.
  test('bagit.txt has its two lines and no more', () => {
    expect(textOf('bagit.txt')).toBe('BagIt-Version: 1.0\nTag-File-Character-Encoding: UTF-8\n');
  });

  // Sections 2.1.3 and 3: every payload file once, paths below data/, with forward slashes.
  test('the manifest lists every payload file once and nothing else', () => {
    const lines = textOf('manifest-sha256.txt').split('\n').slice(0, -1);
    const listed = lines.map((line) => /^[0-9a-f]{64} {2}(data\/[^\\]+)$/.exec(line)?.[1]);
    expect(listed).not.toContain(undefined);
    expect(new Set(listed).size).toBe(listed.length);
    const decoded = listed.map((path) =>
      (path as string).replaceAll('%0A', '\n').replaceAll('%0D', '\r').replaceAll('%25', '%'),
    );
    expect(decoded.sort()).toEqual(files.filter((file) => file.startsWith('data/')));
  });

  // Section 2.2.1.
  test('the tag manifest lists every other tag file, and no tag manifest', () => {
    const listed = textOf('tagmanifest-sha256.txt')
      .split('\n')
      .slice(0, -1)
      .map((line) => line.slice(66));
    expect(listed.sort()).toEqual(
      files.filter((file) => !file.startsWith('data/') && !file.startsWith('tagmanifest')),
    );
  });

  // Section 2.2.2.
  test('Payload-Oxum is right', () => {
    const payload = files.filter((file) => file.startsWith('data/'));
    const bytes = payload.reduce((sum, file) => sum + statSync(join(bag, file)).size, 0);
    expect(textOf('bag-info.txt')).toMatch(new RegExp(`^Payload-Oxum: ${bytes}\\.${payload.length}$`, 'm'));
  });
});

/** What the libraries of Debian found; null where they are missing. test/data/bag/scripts/validate.py says how. */
function validated(): Record<string, Record<string, unknown>> | null {
  const has = spawnSync(PYTHON, ['-c', 'import prov, pyld, rdflib']).status === 0;
  const packed = has
    ? spawnSync('npm', ['pack', 'ro-crate@3.7.2', '--silent'], { cwd: folder, encoding: 'utf8' })
    : null;
  if (packed?.status !== 0) {
    console.log(
      'left out: python3-prov, python3-pyld and python3-rdflib, or the registry with the RO-Crate context, are not there',
    );
    return null;
  }
  execFileSync('tar', ['xzf', packed.stdout.trim(), 'package/lib/context.json'], { cwd: folder });
  const script = join(root, 'test', 'data', 'bag', 'scripts', 'validate.py');
  const context = join(folder, 'package', 'lib', 'context.json');
  return JSON.parse(execFileSync(PYTHON, [script, join(bag, 'data'), context], { encoding: 'utf8' }));
}

test('the provenance loads, and the crate expands without losing a term', () => {
  const found = validated();
  if (found === null) return;
  const { 'provenance.json': prov, 'ro-crate-metadata.json': crate } = found;
  expect(prov).toMatchObject({ 'round trip': 'equal', records: prov?.['unified records'] });
  expect(prov?.records).toBeGreaterThan(100);
  const entities = JSON.parse(textOf('data/ro-crate-metadata.json'))['@graph'].length;
  expect(crate).toMatchObject({
    'entities that lost a property': [],
    'expanded entities': entities,
    'triples read by rdflib': crate?.['n-quads'],
    'files that are no part': [],
    'parts that are no file': [],
  });
});

test('is the same bytes when it is made twice', () => {
  expect(platebook(['bag', 'run', '1', '--to', 'again'], folder)).toMatchObject({ status: 0 });
  const again = join(folder, 'again');
  expect(filesBelow(again)).toEqual(files);
  for (const file of files) expect(digestOf(join(again, file)), file).toBe(digestOf(join(bag, file)));
});

test('is executed again in an empty directory, and is identical', () => {
  const empty = join(folder, 'empty');
  mkdirSync(empty);
  const { status, out, err } = platebook(['rerun', bag, '--json'], empty);
  expect(err).toBe('');
  const { verdict, outputs } = JSON.parse(out);
  expect(verdict).toBe('identical');
  expect(outputs.length).toBeGreaterThan(20);
  expect(status).toBe(0);
  expect(existsSync(join(empty, 'book'))).toBe(false);
});

test('is taken over into another book, and its proof still checks', () => {
  expect(platebook(['bag', bag, '--into', 'other'], folder)).toMatchObject({ status: 0 });
  expect(platebook(['audit', '--book', 'other'], folder).out).toMatch(/: sound/);
  const proofs = files.filter((file) => /proof.*\.json$/.test(file));
  expect(proofs.length).toBeGreaterThan(0);
  for (const proof of proofs) {
    const script = files.find((file) => file.endsWith('check-proof.mjs')) as string;
    expect(spawnSync(process.execPath, [join(bag, script), join(bag, proof)]).status, proof).toBe(0);
  }
});

/** The commands which a run suggests, as a shell would run them from the folder of the run; last, since they add to the book. */
test('what the run suggests to go on with works, word for word', () => {
  const suggested = said.slice(said.indexOf('To go on:')).split('\n').slice(1);
  const lines = suggested.map((line) => line.trim()).filter((line) => line.startsWith('npx platebook '));
  expect(lines.length).toBeGreaterThanOrEqual(3);
  for (const command of lines.flatMap((line) => line.split(' && '))) {
    const { status, out } = platebook(command.split(' ').slice(2), folder);
    expect({ command, status, says: out !== '' || command.includes('--quiet') }).toEqual({
      command,
      status: 0,
      says: true,
    });
  }
});
