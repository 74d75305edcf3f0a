/** Restores recorded code into a program that stages run with: the files of the import closure at their places below a
 *  temporary directory, their packages beside them, the runtime of the recorded release.
 *
 *      DIRECTORY/code-DIGEST/stages/…          the recorded files
 *      DIRECTORY/code-DIGEST/package.json      says that they are modules
 *      DIRECTORY/code-DIGEST/node_modules      a link to what is installed here, or to
 *      DIRECTORY/packages-DIGEST/node_modules  what the recorded lock file names
 *      DIRECTORY/runtime-RELEASE/              another release than the present one
 *
 *  The process in which a stage runs is ours, never recorded: it sets the permissions and refuses the network before the
 *  first line of recorded code is loaded. */

import { mkdirSync, mkdtempSync, realpathSync, rmSync, symlinkSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { dirname, join } from 'node:path';
import { sha256 } from '../../ledger/digest.ts';
import type { RecordedCode, StageEntry } from '../../ledger/entry.ts';
import { LedgerProblem } from '../../ledger/problem.ts';
import { faultOfPath } from '../bag/paths.ts';
import type { RestoredProgram } from '../job.ts';
import { modulesFolder } from '../program.ts';
import { differingPackages, installPackages, packagesText } from './packages.ts';
import { codeNotKept, codeNotRestored } from './problem.ts';
import { engineOfRelease } from './runtime.ts';

export interface Restoration {
  /** The program of each stage, by the number of its entry. */
  readonly programs: ReadonlyMap<number, RestoredProgram>;
  /** Removes everything that was restored. */
  remove(): void;
}

export interface RestoreRequest {
  readonly stages: readonly StageEntry[];
  /** Bytes of a kept file. @throws LedgerProblem 'store-missing' */
  readonly read: (digest: string) => Uint8Array;
  /** The executable of the present release. */
  readonly engine: string;
}

/** Restores the programs of stages. Stages with the same code share one.
 *  @throws RunnerProblem 'code-not-kept', 'code-not-restored'; nothing is left behind */
export async function restorePrograms({ stages, read, engine }: RestoreRequest): Promise<Restoration> {
  const directory = realpathSync(mkdtempSync(join(tmpdir(), 'platebook-code-')));
  const remove = () => rmSync(directory, { recursive: true, force: true });
  const programs = new Map<number, RestoredProgram>();
  try {
    for (const stage of stages) {
      const files = readCode(stage, read);
      const modules = await modulesOf(stage, files, directory);
      const release = join(directory, `runtime-${sha256(stage.code.runtime).slice(0, 12)}`);
      const root = join(directory, `code-${stage.code.digest}`);
      const kindFile = layFiles(stage, files, root, modules);
      programs.set(stage.number, {
        kindFile,
        readable: [root, modules],
        engine: await engineOfRelease(stage.code.runtime, engine, release),
        code: stage.code,
      });
    }
    return { programs, remove };
  } catch (error) {
    remove();
    throw error;
  }
}

interface CodeFiles {
  readonly sources: ReadonlyMap<string, Uint8Array>;
  readonly package: Uint8Array;
  readonly lock: Uint8Array | null;
}

function readCode(stage: StageEntry, read: RestoreRequest['read']): CodeFiles {
  const { code } = stage;
  if (code.package === undefined) throw codeNotKept(stage, 'an entry from before code was kept');
  const readKept = (digest: string, name: string) => {
    let bytes: Uint8Array;
    try {
      bytes = read(digest);
    } catch (error) {
      if (error instanceof LedgerProblem)
        throw codeNotKept(stage, `no ${name} with digest ${digest.slice(0, 12)}…`);
      throw error;
    }
    if (sha256(bytes) === digest) return bytes;
    throw codeNotKept(stage, `a ${name} whose digest is not ${digest.slice(0, 12)}…`);
  };
  const sources = new Map(Object.entries(code.files).map(([path, digest]) => [path, readKept(digest, path)]));
  return {
    sources,
    package: readKept(code.package.digest, 'package.json'),
    lock: code.lock === undefined ? null : readKept(code.lock.digest, 'lock file'),
  };
}

/** The node_modules folder in which every recorded package has its recorded version. */
async function modulesOf(stage: StageEntry, files: CodeFiles, directory: string): Promise<string> {
  const { packages } = stage.code;
  const differing = differingPackages(packages);
  if (differing.length === 0) return realpathSync(modulesFolder());
  if (files.lock === null) {
    const found = `a record without lock file, and other packages here: ${packagesText(differing)}`;
    throw codeNotRestored(`entry ${stage.number} (${stage.name})`, 'the recorded packages', found);
  }
  const folder = join(directory, `packages-${sha256(files.lock)}`);
  const modules = join(folder, 'node_modules');
  if (differingPackages(packages, modules).length === 0) return modules;
  return installPackages(folder, { package: files.package, lock: files.lock }, packages);
}

/** Lays the files down and returns the path of the kind's declaration. */
function layFiles(stage: StageEntry, files: CodeFiles, root: string, modules: string): string {
  requireInside(stage.code, stage);
  const { kind } = stage;
  const declaration = [...files.sources.keys()].find(
    (path) => /(^|\/)([^/]+)\/\2\.[jt]s$/.exec(path)?.[2] === kind,
  );
  if (declaration === undefined) {
    throw codeNotRestored(
      `entry ${stage.number} (${stage.name})`,
      `a file ${kind}/${kind}.ts in its code`,
      'none',
    );
  }
  for (const [path, bytes] of [...files.sources, ['package.json', files.package] as const]) {
    mkdirSync(dirname(join(root, path)), { recursive: true });
    writeFileSync(join(root, path), bytes);
  }
  rmSync(join(root, 'node_modules'), { force: true });
  symlinkSync(modules, join(root, 'node_modules'), 'junction');
  return join(root, declaration);
}

/** A record says where its files go; none may leave the directory, or stand in for a package. */
function requireInside(code: RecordedCode, stage: StageEntry): void {
  for (const path of Object.keys(code.files)) {
    const fault = path.split('/').includes('node_modules') ? 'a place among the packages' : faultOfPath(path);
    if (fault === null) continue;
    const place = `entry ${stage.number} (${stage.name}), code file ${JSON.stringify(path.slice(0, 80))}`;
    throw codeNotRestored(place, 'a path below the program', fault);
  }
}
