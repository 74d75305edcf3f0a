import { existsSync, mkdirSync, readdirSync, readFileSync, renameSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { beforeAll, describe, expect, it } from 'vitest';
import { openBook } from '../../../ledger/book.ts';
import { sha256 } from '../../../ledger/digest.ts';
import { checkProof } from '../../../ledger/proof.ts';
import { openBag } from '../../../runner/bag/open-bag.ts';
import { document, platebook } from '../test-io.ts';
import { temporaryFolder } from '../test-jobs.ts';
import {
  awkwardName,
  checkWithSha256sum,
  copyOf,
  filesBelow,
  refusal,
  resealTags,
  tinyBook,
} from './tiny-book.ts';

let folder = '';

beforeAll(async () => {
  folder = await tinyBook();
});

describe('a bag', () => {
  let bag = '';
  let made: { path: string; files: number; bytes: number };

  beforeAll(async () => {
    made = await document(folder, ['bag', 'run', '1', '--to', 'bag']);
    bag = join(folder, 'bag');
  });

  it('checks with sha256sum alone, and the document counts its payload', () => {
    checkWithSha256sum(bag);
    const payload = filesBelow(bag).filter((path) => path.startsWith('data/'));
    const bytes = payload.reduce((sum, path) => sum + readFileSync(join(bag, path)).length, 0);
    expect(made).toEqual({ path: bag, files: payload.length, bytes });
    expect(readFileSync(join(bag, 'bag-info.txt'), 'utf8')).toContain(
      `Payload-Oxum: ${bytes}.${payload.length}\n`,
    );
  });

  it('has the same bytes when it is made twice', async () => {
    await document(folder, ['bag', 'run', '1', '--to', 'again']);
    const again = join(folder, 'again');
    expect(filesBelow(again)).toEqual(filesBelow(bag));
    for (const path of filesBelow(bag)) {
      expect(readFileSync(join(again, path)).equals(readFileSync(join(bag, path))), path).toBe(true);
    }
  });

  it('holds entries whose files have the digests of the ledger', () => {
    const book = openBook(join(folder, 'book'));
    for (const number of [1, 2, 3, 4]) {
      expect(sha256(readFileSync(join(bag, 'data', 'entries', `${number}.json`)))).toBe(
        book.digestOf(number),
      );
    }
    book.close();
  });

  it('gives a file with an awkward name a safe one, and every description finds it', () => {
    const digest = sha256(readFileSync(join(folder, 'data', awkwardName)));
    const name = `${digest.slice(0, 16)}-own 100_ wide; it's ‘ü’.fits`;
    expect(readdirSync(join(bag, 'data', 'inputs'))).toEqual([name]);
    const crate = JSON.parse(readFileSync(join(bag, 'data', 'ro-crate-metadata.json'), 'utf8'));
    // RFC 3986, section 2: octets of UTF-8 outside the unreserved and sub-delimiter characters are percent-encoded.
    const id = `inputs/${digest.slice(0, 16)}-own%20100_%20wide%3B%20it's%20%E2%80%98%C3%BC%E2%80%99.fits`;
    expect(crate['@graph'].map((entity: { '@id': string }) => entity['@id'])).toContain(id);
    const provenance = JSON.parse(readFileSync(join(bag, 'data', 'provenance.json'), 'utf8'));
    expect(provenance.entity[`sha256:${digest}`]['prov:label']).toBe(`data/${awkwardName}`);
  });

  it('holds the code of every stage under its recorded digests, with package.json and the lock file', () => {
    const stage = JSON.parse(readFileSync(join(bag, 'data', 'entries', '1.json'), 'utf8'));
    const files = {
      ...stage.code.files,
      'package.json': stage.code.package.digest,
      'package-lock.json': stage.code.lock.digest,
    };
    for (const [path, digest] of Object.entries(files)) {
      expect(sha256(readFileSync(join(bag, 'data', 'code', path)))).toBe(digest);
    }
    expect(Object.keys(files).length).toBeGreaterThan(10);
  });

  it('is refused a place that is taken, and leaves nothing beside it', async () => {
    const { status, err } = await platebook(folder, ['bag', 'run', '1', '--to', 'data']);
    expect(status).toBe(2);
    expect(err).toMatch(
      /expected an empty place for the bag, got a directory that holds something\. Name another directory with --to\.\n$/,
    );
    expect(readdirSync(folder).filter((name) => name.startsWith('.'))).toEqual([]);
  });

  it('is computed again, identical, in an empty directory and without the book', async () => {
    const elsewhere = temporaryFolder();
    const said = await platebook(elsewhere, ['rerun', bag, '--json']);
    expect(said.status).toBe(0);
    expect(JSON.parse(said.out)).toMatchObject({
      verdict: 'identical',
      run: 1,
      differences: [],
      entry: null,
    });
    expect(JSON.parse(said.out).outputs.length).toBe(4);
    expect(readdirSync(elsewhere)).toEqual([]);
    const text = await platebook(elsewhere, ['rerun', bag]);
    expect(text.out).toContain('identical: every output has the recorded bytes');
    expect(text.err).toContain('The bag is whole; its 4 entries are under a seal of ');
  });

  it('of a plate holds what the plate depends on and no more, with the run that published it', async () => {
    const { lineage } = await document(folder, ['trace', '2']);
    expect(lineage.length).toBe(1);
    const plate = (await document(folder, ['contents', '--type', 'plate'])).entries[0].plate;
    await document(folder, ['bag', plate, '--to', 'plate-bag']);
    const names = filesBelow(join(folder, 'plate-bag')).filter((path) => path.startsWith('data/entries'));
    const drawn = openBag(join(folder, 'plate-bag'));
    expect(names.length).toBe(3);
    expect([...drawn.entries.values()].map(({ entry }) => entry.type).sort()).toEqual([
      'plate',
      'run',
      'stage',
    ]);
    const { verdict, outputs } = await document(temporaryFolder(), ['rerun', join(folder, 'plate-bag')]);
    expect(verdict).toBe('identical');
    expect(outputs.every(({ stage }: { stage: string }) => stage === 'picture')).toBe(true);
  });

  it('is taken over into another book, where the origin is traced and the proof still holds', async () => {
    const other = temporaryFolder();
    const first = await document(other, ['bag', bag, '--into', 'book']);
    expect(first).toMatchObject({
      entries: [1, 2, 3, 4],
      standing: [],
      files: made.files,
      bytes: made.bytes,
    });
    const { lineage } = await document(other, ['trace', join(bag, 'data', 'plates', platePng(bag))]);
    const origins = lineage.map(({ type, origin }: { type: string; origin: { number: number } }) => [
      type,
      origin.number,
    ]);
    expect(origins.length).toBe(2);
    const book = openBook(join(other, 'book'));
    const source = openBook(join(folder, 'book'));
    for (const entry of book.entries()) {
      if (entry.type !== 'import' || entry.proof === null) throw new Error('no import with a proof');
      expect(entry.origin.digest).toBe(source.digestOf(entry.origin.number));
      expect(sha256(book.store.read(entry.record.digest))).toBe(entry.origin.digest);
      const proof = JSON.parse(book.store.read(entry.proof.digest).toString());
      expect(checkProof(proof)).toMatchObject({ book: source.name, number: entry.origin.number });
      expect(proof.entry).toBe(book.store.read(entry.record.digest).toString());
    }
    book.close();
    source.close();
    expect(await document(other, ['audit'])).toMatchObject({ verdict: 'sound', problems: [], remarks: [] });
    const again = await document(other, ['bag', bag, '--into', 'book']);
    expect(again).toMatchObject({ entries: [], standing: [1, 2, 3, 4] });
    expect((await document(other, ['audit'])).entries).toBe(4);
  });
});

describe('a bag with inputs by reference', () => {
  let bag = '';

  beforeAll(async () => {
    bag = join(folder, 'by-reference');
    await document(folder, ['bag', 'run', '1', '--to', bag, '--inputs', 'reference']);
  });

  it('says in its page which files are not there, and checks all the same', () => {
    checkWithSha256sum(bag);
    expect(existsSync(join(bag, 'data', 'inputs'))).toBe(false);
    expect(existsSync(join(bag, 'fetch.txt'))).toBe(false);
    const page = readFileSync(join(bag, 'README.txt'), 'utf8');
    const digest = sha256(readFileSync(join(folder, 'data', awkwardName)));
    expect(page).toContain(`"data/${awkwardName}", 5760 bytes\n    ${digest}\n`);
    expect(page).toContain('no place where\nthey can be fetched is known');
  });

  it('is computed again where the files lie as the recipe names them, and not elsewhere', async () => {
    const { verdict } = await document(folder, ['rerun', bag]);
    expect(verdict).toBe('identical');
    const { status, err } = await platebook(temporaryFolder(), ['rerun', bag, '--quiet']);
    expect(status).toBe(1);
    expect(err).toContain(awkwardName);
  });

  it('names where a file can be fetched, counts as incomplete until it is, and then is whole', async () => {
    const location = `data/${awkwardName}=https://example.org/data/own.fits`;
    await document(folder, [
      'bag',
      'run',
      '1',
      '--to',
      'fetched',
      '--inputs',
      'reference',
      '--location',
      location,
    ]);
    const at = join(folder, 'fetched');
    const fetch = readFileSync(join(at, 'fetch.txt'), 'utf8');
    // RFC 8493, section 2.2.3: URL, length, path.
    expect(fetch).toMatch(
      /^https:\/\/example\.org\/data\/own\.fits 5760 data\/inputs\/[0-9a-f]{16}-own 100_ wide.*\n$/,
    );
    expect(refusal(at)).toMatch(
      /^data\/inputs\/.*: expected the file itself, got only where to fetch it\. Fetch https:\/\/example\.org\/data\/own\.fits to that place, then repeat\.$/,
    );
    const path = fetch.trimEnd().split(' ').slice(2).join(' ');
    mkdirSync(join(at, 'data', 'inputs'));
    writeFileSync(join(at, path), readFileSync(join(folder, 'data', awkwardName)));
    expect(refusal(at)).toBe('');
    checkWithSha256sum(at);
    writeFileSync(join(at, path), 'another file with the same name');
    expect(refusal(at)).toContain('expected a payload of');
  });

  it('refuses a bag when the recorded file is gone or another', async () => {
    const kept = join(folder, 'data', awkwardName);
    renameSync(kept, `${kept}.kept`);
    const gone = await platebook(folder, ['bag', 'run', '1', '--to', 'none']);
    expect(gone.status).toBe(1);
    expect(gone.err).toMatch(
      /expected the file with digest [0-9a-f]{12}…, got none\. Restore it, or make the bag with --inputs reference\.\n$/,
    );
    writeFileSync(kept, 'other bytes');
    const other = await platebook(folder, ['bag', 'run', '1', '--to', 'none']);
    expect(other.err).toMatch(
      /expected the file with digest [0-9a-f]{12}…, got one with digest [0-9a-f]{12}…\. Restore it/,
    );
    expect(existsSync(join(folder, 'none'))).toBe(false);
    renameSync(`${kept}.kept`, kept);
  });
});

describe('the call of bag', () => {
  it('says what it lacks', async () => {
    const say = async (...words: string[]) => (await platebook(folder, ['bag', ...words])).err;
    expect(await say('run', '1')).toContain(
      'expected --to with a directory for the bag, or --into with a book, got both or none.',
    );
    expect(await say('run', '1', '--to', 'x', '--inputs', 'all')).toBe(
      '--inputs: expected kept or reference, got "all". Write one of the two.\n',
    );
    expect(await say('run', '1', '--to', 'x', '--location', 'data')).toBe(
      '--location: expected FILE=URL with an http or https URL, got "data". Write it so.\n',
    );
    expect(await say(join('data', awkwardName), '--to', 'x')).toContain(
      'got a file that came from outside. Name one of these.',
    );
    expect(await say('data', '--into', 'other')).toContain(
      'expected a bag, a directory with bagit.txt in it, got a directory without it.',
    );
    expect(await say('nowhere', '--into', 'other')).toContain('got nothing. Name the directory of a bag.');
    expect(existsSync(join(folder, 'other'))).toBe(false);
  });

  it('is content with a bag that other software listed in another order', async () => {
    await document(folder, ['bag', 'run', '1', '--to', 'listed']);
    const copy = copyOf(join(folder, 'listed'));
    const manifest = join(copy, 'manifest-sha256.txt');
    writeFileSync(manifest, `${readFileSync(manifest, 'utf8').trimEnd().split('\n').reverse().join('\n')}\n`);
    resealTags(copy);
    expect(refusal(copy)).toBe('');
  });
});

function platePng(bag: string): string {
  return readdirSync(join(bag, 'data', 'plates')).find((name) => name.endsWith('.png')) ?? '';
}

describe('a bag of something withdrawn', () => {
  it('holds the withdrawal, says so on its page, and when it is computed again', async () => {
    const book = openBook(join(folder, 'book'), { by: { name: 'A. Tester' } });
    book.append({ type: 'withdrawal', withdraws: 1, reason: 'Made from the wrong image.' });
    book.close();
    await document(folder, ['bag', '1', '--to', 'withdrawn']);
    const bag = join(folder, 'withdrawn');
    expect(readFileSync(join(bag, 'README.txt'), 'utf8')).toContain(
      'WITHDRAWN\n---------\n\nDo not rely on what depends on these:\n\n  entry 1, by A. Tester: Made from the wrong image.\n',
    );
    expect([...openBag(bag).entries.values()].map(({ entry }) => entry.type)).toContain('withdrawal');
    const { err } = await platebook(temporaryFolder(), ['rerun', bag]);
    expect(err).toContain('Withdrawn: entry 1. Made from the wrong image.\n');
  });
});
