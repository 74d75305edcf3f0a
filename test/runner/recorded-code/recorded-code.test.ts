import { existsSync, readdirSync, readFileSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { afterEach, beforeAll, describe, expect, it } from 'vitest';
import { sha256 } from '../../../ledger/digest.ts';
import { keptCode } from '../../../runner/recorded-code/keep.ts';
import { differingPackages } from '../../../runner/recorded-code/packages.ts';
import { plainRecorded } from '../../../runner/recorded-code/recorded-kind.ts';
import { add } from '../../data/kinds/add/add.ts';
import { document, platebook } from '../test-io.ts';
import { executeJobs, makeJob, temporaryBook, temporaryFolder } from '../test-jobs.ts';
import { computation, declaration, forgeBook } from './forged-book.ts';

const root = dirname(dirname(dirname(dirname(fileURLToPath(import.meta.url)))));
const sources = (first = '') => ({
  'stages/features/features.ts': declaration,
  'stages/features/compute.ts': computation(first),
});

beforeAll(() => {
  // A place of its own, where what other tests make meanwhile does not lie.
  process.env.TMPDIR = temporaryFolder();
});

afterEach(() => {
  expect(readdirSync(tmpdir()).filter((name) => /^platebook-(code|bag)-/.test(name))).toEqual([]);
});

describe('the code of a stage', () => {
  it('is kept in the store: every file of its import closure, package.json and the lock file', async () => {
    const book = temporaryBook();
    const [outcome] = await executeJobs([makeJob('a', add, { data: [] }, { term: 1, length: 0 })], book);
    const entry = book.entry(outcome?.entry ?? 0);
    if (entry?.type !== 'stage') throw new Error('no stage');
    const kept = keptCode(entry.code);
    expect(kept.map(([path]) => path)).toEqual(
      expect.arrayContaining([
        'test/data/kinds/add/add.ts',
        'test/data/kinds/add/compute.ts',
        'stages/bytes.ts',
        'package.json',
        'package-lock.json',
      ]),
    );
    for (const [path, digest] of kept) {
      expect(sha256(readFileSync(join(root, path))), path).toBe(digest);
      expect(book.store.read(digest).equals(readFileSync(join(root, path)))).toBe(true);
    }
    book.close();
  });

  it('recorded with quantities gives the computation the numbers that it received', () => {
    const recorded = {
      a: { value: 3, unit: 'uas' },
      b: [{ value: 1, unit: '' }],
      c: { value: 'x', unit: 'y' },
      d: { e: null },
    };
    expect(plainRecorded(recorded)).toEqual({ a: 3, b: [1], c: { value: 'x', unit: 'y' }, d: { e: null } });
  });
});

describe('rerun --as-recorded', () => {
  it('computes with the recorded code, where rerun alone computes with the installed code and says so', async () => {
    const folder = temporaryFolder();
    forgeBook(folder, sources());
    const installed = await document(folder, ['rerun', 'run', '1']);
    expect(installed.verdict).toBe('different');
    expect(installed.differences[0]).toBe('ring: the code or the runtime is not the recorded one (entry 1)');
    const recorded = await document(folder, ['rerun', 'run', '1', '--as-recorded']);
    expect(recorded).toMatchObject({ verdict: 'identical', differences: [] });
    expect(recorded.entry).toBe(4);
  });

  it('gives recorded code no file, no network and no process, and no way around it', async () => {
    const secret = join(temporaryFolder(), 'secret.txt');
    writeFileSync(secret, 'secret');
    const deeds = [
      [
        `import { readFileSync } from 'node:fs'; readFileSync(${JSON.stringify(secret)});`,
        'undeclared access',
      ],
      [
        `import { writeFileSync } from 'node:fs'; writeFileSync(${JSON.stringify(`${secret}.new`)}, 'x');`,
        'undeclared access',
      ],
      ["import { execFileSync } from 'node:child_process'; execFileSync('/bin/true');", 'undeclared access'],
      ["import { connect } from 'node:net'; connect(9);", 'node:net: network'],
      ['await fetch("http://127.0.0.1:9/");', 'fetch: network'],
    ] as const;
    for (const [deed, said] of deeds) {
      const folder = temporaryFolder();
      forgeBook(folder, sources(deed));
      const { verdict, differences } = await document(folder, ['rerun', '1', '--as-recorded']);
      expect(verdict, deed).toBe('different');
      expect(differences.join(' '), deed).toContain(said);
    }
    expect(existsSync(`${secret}.new`)).toBe(false);
  });

  it('does not let a recorded file stand in for the part of the program that sets the limits', async () => {
    const folder = temporaryFolder();
    const net =
      "import 'node:net';\nexport class InputProblem extends Error {}\nexport class InternalError extends Error {}\n";
    forgeBook(folder, {
      ...sources("import '../problem.ts';"),
      'stages/problem.ts': net,
      'runner/stage-child.ts': "throw new Error('mine');\n",
    });
    const { differences } = await document(folder, ['rerun', '1', '--as-recorded']);
    expect(differences.join(' ')).toContain('node:net: network');
  });

  it('refuses a record whose files leave the program, or lie among the packages', async () => {
    const tell = async (path: string) => {
      const folder = temporaryFolder();
      forgeBook(folder, { ...sources(), [path]: 'x' });
      const { status, err } = await platebook(folder, ['rerun', '1', '--as-recorded']);
      expect(status).toBe(1);
      return err;
    };
    expect(await tell('../outside.ts')).toBe(
      'entry 1 (ring), code file "../outside.ts": expected a path below the program, got a path with .. in it. ' +
        'Leave out --as-recorded: the installed code computes, and what differs is said.\n',
    );
    expect(await tell('/tmp/outside.ts')).toContain('got an absolute path.');
    expect(await tell('node_modules/fft.js/lib/fft.js')).toContain('got a place among the packages.');
  });

  it('says when the code was not kept', async () => {
    const folder = temporaryFolder();
    forgeBook(folder, sources(), { kept: false });
    const { status, err } = await platebook(folder, ['rerun', '1', '--as-recorded']);
    expect([status, err]).toEqual([
      1,
      'entry 1 (ring): expected its recorded code, got an entry from before code was kept. ' +
        'Leave out --as-recorded: the installed code computes, and what differs is said.\n',
    ]);
  });
});

describe('packages and runtime that are not the installed ones', () => {
  const offline = async (more: object) => {
    const folder = temporaryFolder();
    forgeBook(folder, sources(), more);
    const before = process.env.npm_config_offline;
    process.env.npm_config_offline = 'true';
    try {
      return await platebook(folder, ['rerun', '1', '--as-recorded']);
    } finally {
      if (before === undefined) delete process.env.npm_config_offline;
      else process.env.npm_config_offline = before;
    }
  };

  it('are found by the versions that lie on the disk', () => {
    const version = JSON.parse(
      readFileSync(join(root, 'node_modules', 'yaml', 'package.json'), 'utf8'),
    ).version;
    expect(differingPackages({ yaml: version })).toEqual([]);
    expect(differingPackages({ yaml: '0.0.1', '@none/such': '1.0.0' })).toEqual([
      { name: 'yaml', recorded: '0.0.1', installed: version },
      { name: '@none/such', recorded: '1.0.0', installed: null },
    ]);
  });

  it('are said, without a lock file to install them from', async () => {
    const { status, err } = await offline({ packages: { 'fft.js': '0.0.1' } });
    expect(status).toBe(1);
    expect(err).toMatch(
      /^entry 1 \(ring\): expected the recorded packages, got a record without lock file, and other packages here: fft\.js 0\.0\.1 \(installed: 4\.\d+\.\d+\)\. Leave out/,
    );
  });

  it('are said when the runtime cannot be fetched, and a release that is none is never asked for', async () => {
    const { status, err } = await offline({ runtime: 'v24.0.1' });
    expect(status).toBe(1);
    expect(err).toMatch(
      /^packages: expected Node v24\.0\.1 \(node-\w+-\w+\), got a package manager that ended without them \(.+\)\. Repeat with the package registry within reach/,
    );
    const odd = await offline({ runtime: 'latest --registry=x' });
    expect(odd.err).toContain(
      'the recorded runtime: expected a release such as v24.1.0, got "latest --registry=x".',
    );
  });
});
