/** `withdraw`, `reach` and `countersign`: documents, texts, and what every other command says afterwards. What is found:
 *  test/ledger/withdrawal.test.ts. */

import { copyFileSync, existsSync, readFileSync, statSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { audit } from '../../../ledger/audit.ts';
import { contentsCommand } from '../../../runner/commands/contents.ts';
import { countersignCommand } from '../../../runner/commands/countersign.ts';
import { diffCommand } from '../../../runner/commands/diff.ts';
import { reachCommand } from '../../../runner/commands/reach.ts';
import { traceCommand } from '../../../runner/commands/trace.ts';
import { withdrawCommand } from '../../../runner/commands/withdraw.ts';
import { main } from '../../../runner/main.ts';
import { keyFile } from '../../ledger/make-book.ts';
import { type Filled, filledBook, keepingIo, longLines, optionsFor } from './book-io.ts';

// RFC 8032 section 7.1, TEST 2.
const OTHER_SEED = '4ccd089b28ff96da9db6c346ec114e0f5b8a319f35aba624da8cf6ed4fb8a6fb';
const REASON = 'the gain table of station ONE was wrong';
let filled: Filled;

beforeEach(() => {
  filled = filledBook();
});

afterEach(() => filled.remove());

const options = (json = false) => optionsFor(filled.book, json);
const withdraw = async (words: string[], json = false, reason = REASON) => {
  const io = keepingIo(filled.directory);
  expect(await withdrawCommand(words, { ...options(json), reason }, io)).toBe(0);
  return io;
};

describe('withdraw', () => {
  test('prints one JSON document, and enters who and why', async () => {
    const io = await withdraw(['2'], true);
    const document = JSON.parse(io.printed());
    expect(document).toMatchObject({ entry: 17, withdraws: 2 });
    expect(document.reached).toHaveLength(9);
    const shown = keepingIo(filled.directory);
    traceCommand(['17'], options(true), shown);
    expect(JSON.parse(shown.printed()).lineage[0]).toMatchObject({
      type: 'withdrawal',
      withdraws: 2,
      reason: REASON,
      by: { name: 'B. Reader' },
    });
    expect(audit({ directory: filled.book })).toMatchObject({ verdict: 'sound', problems: [] });
  });

  test('says what it reaches', async () => {
    const text = (await withdraw(['2'])).printed();
    expect(text).toContain(
      'Entry 2, stage visibilities (ingest), is withdrawn, in entry 17. It reaches 2 runs, 3',
    );
    expect(text).toMatch(/^ {5}15 {2}plate {3}14b-\w{6} +ring-image +run 2$/m);
    expect(longLines(text)).toEqual([]);
  });

  test('shows everywhere from then on', async () => {
    await withdraw(['2']);
    const io = () => keepingIo(filled.directory);
    const [traced, listed, differing] = [io(), io(), io()];
    traceCommand(['9'], options(), traced);
    expect(traced.printed()).toContain(
      'DEPENDS ON SOMETHING WITHDRAWN:\n\n  entry 2       withdrawn by B. Reader, ',
    );
    expect(traced.printed().replace(/\s+/g, ' ')).toContain(`UTC, in entry 17: ${REASON}`);
    contentsCommand({ ...options(), last: 20 }, listed);
    expect(listed.printed()).toMatch(/^ {6}2 .*… {2}‡$/m);
    expect(listed.printed()).toMatch(/^ {5}16 .*… {2}†$/m);
    expect(listed.printed()).toMatch(/^ {6}3 .*…$/m);
    expect(listed.printed()).toContain('‡ withdrawn   † depends on something withdrawn\n');
    diffCommand(['1', '2'], options(), differing);
    expect(differing.printed()).toContain(
      '  withdrawn    both runs depend on entry 2, WITHDRAWN in entry 17: the gain',
    );
    expect(differing.printed()).toContain('ring-diameter  †42.10 +0.80 −0.80  †42.90');
    for (const { printed } of [traced, listed, differing]) expect(longLines(printed())).toEqual([]);
    const itself = io();
    traceCommand(['2'], options(), itself);
    expect(itself.printed()).toContain('WITHDRAWN. It does not stand any more:');
  });

  test('takes a plate, a run or a number, and refuses a file from outside', async () => {
    expect(JSON.parse((await withdraw(['run', '1'], true)).printed()).withdraws).toBe(10);
    expect(JSON.parse((await withdraw(['ring-diameter'], true)).printed()).withdraws).toBe(13);
    await expect(withdraw(['da7ada7a'])).rejects.toThrow(
      'da7ada7a: expected an entry, got a file from outside, which no entry made. Name an entry that read it, such as 1.',
    );
    await expect(withdraw(['2'], false, '  ')).rejects.toThrow('expected a reason in --reason, got none.');
    await expect(withdraw(['99'])).rejects.toThrow('no entry 99');
  });

  test('needs a reason on the command line', async () => {
    const io = keepingIo(filled.directory);
    const words = ['withdraw', '2', '--book', filled.book];
    expect(await main(words, io, new AbortController().signal)).toBe(2);
    expect(io.said()).toContain("required option '--reason <text>' not specified");
    expect(await main([...words, '--reason', REASON, '--json'], io, new AbortController().signal)).toBe(0);
    expect(JSON.parse(io.printed())).toMatchObject({ entry: 17, withdraws: 2 });
  });
});

describe('reach', () => {
  test('prints one JSON document, nearest first', () => {
    const io = keepingIo(filled.directory);
    expect(reachCommand(['da7ada7a'], options(true), io)).toBe(0);
    const document = JSON.parse(io.printed());
    expect(Object.keys(document)).toEqual(['subject', 'reached']);
    expect(document.subject).toMatchObject({ type: 'file' });
    expect(document.reached[0]).toEqual({ entry: 10, type: 'run', name: 'lantern-ring', run: 1 });
    expect(document.reached).toContainEqual({ entry: 6, type: 'number', name: 'ring-width', run: 1 });
  });

  test('prints a table', () => {
    const io = keepingIo(filled.directory);
    reachCommand(['11'], options(), io);
    expect(io.printed()).toMatch(
      /^Entry 11 of book lantern reaches 1 run, 1 plate and 2 published numbers\n\n {2}entry {2}type/,
    );
    expect(longLines(io.printed())).toEqual([]);
    const none = keepingIo(filled.directory);
    reachCommand(['16'], options(), none);
    reachCommand(['9'], options(), none);
    expect(none.printed()).toContain(
      'Entry 16 of book lantern reaches no run, no plate and 2 published numbers',
    );
    expect(none.printed()).toContain(
      'Entry 9 of book lantern reaches 1 run, no plate and no published number',
    );
  });
});

describe('countersign', () => {
  const sign = async (words: string[], more: { key?: string; by?: string } = {}, json = true) => {
    const io = keepingIo(filled.directory);
    expect(await countersignCommand(words, { ...options(json), ...more }, io)).toBe(0);
    return io;
  };

  test('signs an entry with the configured key, which is made', async () => {
    const io = await sign(['9']);
    expect(JSON.parse(io.printed())).toMatchObject({ entry: 17, signs: 9 });
    expect(statSync(join(filled.directory, 'reader.pem')).mode & 0o777).toBe(0o600);
    expect(io.said()).toContain('There was no key to sign seals with, so one was made:');
    expect(io.said()).toContain('joins the keys in seals/keys.');
    const shown = keepingIo(filled.directory);
    traceCommand(['9'], options(), shown);
    expect(shown.printed()).toContain('Countersigned by:\n\n  entry 9       B. Reader, ');
    expect(audit({ directory: filled.book })).toMatchObject({ verdict: 'sound', problems: [] });
  });

  test('signs with another person’s key', async () => {
    const key = keyFile(filled.directory, OTHER_SEED);
    const document = JSON.parse((await sign(['run', '1'], { key, by: 'C. Reader' })).printed());
    expect(document).toMatchObject({ signs: 10 });
    expect(document.key).toMatch(/^C\.%20Reader\+/);
    // RFC 8032's public key.
    const open = Buffer.from('013d4017c3e843895a92b70aa74d1b7ebc9c982ccf2ec4968cc0cd55f12af4660c', 'hex');
    expect(document.key.endsWith(open.toString('base64'))).toBe(true);
  });

  test('signs a seal, the latest or one in a file', async () => {
    copyFileSync(join(filled.book, 'seals/latest'), join(filled.directory, 'paper.txt'));
    const latest = JSON.parse((await sign(['seal'])).printed());
    expect(latest).toMatchObject({ entry: 17, signs: 16, what: expect.stringMatching(/^lantern\n16\n/) });
    const printed = JSON.parse((await sign(['paper.txt'])).printed());
    expect(printed).toMatchObject({ entry: 18, signs: 16, what: latest.what });
    const io = await sign(['seal'], {}, false);
    expect(io.printed()).toMatch(/^The seal of 18 entries is signed by B\. Reader, in entry 19, with key\n?/);
  });

  test('says when the signer wrote the entry', async () => {
    const io = await sign(['9'], { by: 'A. Keeper' });
    expect(io.said()).toContain('Note: A. Keeper wrote entry 9 too;');
  });

  test('refuses a key that is not there, and makes none in its place', async () => {
    const key = join(filled.directory, 'typo.pem');
    await expect(sign(['9'], { key })).rejects.toThrow(
      `${key}: expected a private key in PEM, got no such file.`,
    );
    expect(existsSync(key)).toBe(false);
    writeFileSync(key, readFileSync(keyFile(filled.directory)), { mode: 0o640 });
    await expect(sign(['9'], { key })).rejects.toThrow(`Set it with: chmod 600 ${key}`);
  });
});
