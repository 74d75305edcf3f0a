/** The digest of a kind's code: its import closure, the third-party packages with their versions from the lock file,
 *  and the runtime release. Anything in it that changes gives the kind's stages another key. */

import { existsSync, readFileSync } from 'node:fs';
import { dirname, join, relative, resolve, sep } from 'node:path';
import { canonicalJson } from '../ledger/canonical.ts';
import { sha256 } from '../ledger/digest.ts';
import type { RecordedCode } from '../ledger/entry.ts';
import { modulesFolder, packageRoot, sourceExtension } from './program.ts';

/** Import specifiers of static and dynamic imports and re-exports; type-only imports leave no trace at run time. */
const importPattern =
  /(?:^|[\s;}])(?:import|export)\s+(?!type\b)(?:[\w*{}\s,$]+?\s+from\s+)?['"]([^'"\n]+)['"]|\bimport\(\s*['"]([^'"\n]+)['"]\s*\)/g;

/** Describes the code of the kind declared in `folder`/KIND/KIND.ts.
 *  @param version  the kind's declared version
 *  @throws Error when a file of the closure cannot be read. Cost: one read per file of the closure. */
export function codeOfKind(folder: string, kind: string, version: number): RecordedCode {
  const closure = importClosure(join(folder, kind, `${kind}${sourceExtension}`));
  const files: Record<string, string> = {};
  for (const [path, { digest }] of closure.files) files[programPath(path)] = digest;
  const packages = versionsOf([...closure.packages].sort());
  const runtime = process.version;
  return {
    digest: sha256(canonicalJson({ files, packages, runtime, version })),
    version,
    files,
    packages,
    runtime,
  };
}

/** The files of a kind's import closure, by path as the record names them: the very bytes that `codeOfKind` digests. */
export function codeFilesOf(folder: string, kind: string): Map<string, Uint8Array> {
  const { files } = importClosure(join(folder, kind, `${kind}${sourceExtension}`));
  return new Map([...files].map(([path, { bytes }]) => [programPath(path), bytes]));
}

interface SourceFile {
  readonly bytes: Buffer;
  readonly digest: string;
  readonly specifiers: readonly string[];
}

interface Closure {
  readonly files: ReadonlyMap<string, SourceFile>;
  readonly packages: ReadonlySet<string>;
}

/** Source files by path: kinds share most of theirs. */
const sourceFiles = new Map<string, SourceFile>();

/** All of our files that `entry` reaches, sorted by path, and the names of the packages they import. */
export function importClosure(entry: string): Closure {
  const files = new Map<string, SourceFile>();
  const packages = new Set<string>();
  const waiting = [entry];
  for (let path = waiting.pop(); path !== undefined; path = waiting.pop()) {
    if (files.has(path)) continue;
    const file = sourceFiles.get(path) ?? readSource(path);
    sourceFiles.set(path, file);
    files.set(path, file);
    for (const specifier of file.specifiers) {
      if (specifier.startsWith('.')) waiting.push(resolve(dirname(path), specifier));
      else if (!specifier.startsWith('node:')) packages.add(packageName(specifier));
    }
  }
  const sorted = [...files].sort(([a], [b]) => (a < b ? -1 : 1));
  return { files: new Map(sorted), packages };
}

function readSource(path: string): SourceFile {
  const bytes = readFileSync(path);
  return { bytes, digest: sha256(bytes), specifiers: importsOf(bytes.toString('utf8')) };
}

export function importsOf(source: string): string[] {
  return [...source.matchAll(importPattern)].map((match) => match[1] ?? match[2] ?? '');
}

function packageName(specifier: string): string {
  const parts = specifier.split('/');
  return specifier.startsWith('@') ? parts.slice(0, 2).join('/') : (parts[0] ?? specifier);
}

/** The path of a file as the record names it: below the program's root, with forward slashes. */
function programPath(path: string): string {
  return relative(packageRoot, path).split(sep).join('/');
}

interface LockFile {
  readonly packages: Readonly<
    Record<string, { version?: string; dependencies?: Readonly<Record<string, string>> }>
  >;
}

interface FoundPackage {
  /** Such as `node_modules/a`. */
  readonly place: string;
  readonly version: string;
  readonly dependencies: Readonly<Record<string, string>>;
}

const lockPath = join(packageRoot, 'package-lock.json');
/** Read at the first question; null where there is none, as in an installed package. */
let lockFile: LockFile | null | undefined;
const foundPackages = new Map<string, FoundPackage | null>();

/** Versions of packages and of all that they depend on. A nested copy is named by its place. */
function versionsOf(names: readonly string[]): Record<string, string> {
  const versions: Record<string, string> = {};
  const waiting = names.map((name) => ({ name, from: '' }));
  for (let next = waiting.pop(); next !== undefined; next = waiting.pop()) {
    const found = findPackage(next.name, next.from);
    if (found === null) continue;
    const key = found.place.replaceAll('node_modules/', '');
    if (key in versions) continue;
    versions[key] = found.version;
    for (const name of Object.keys(found.dependencies)) waiting.push({ name, from: found.place });
  }
  return versions;
}

/** Looks a package up as Node does: next to the package that asks, then outwards. */
function findPackage(name: string, from: string): FoundPackage | null {
  const key = `${from}:${name}`;
  const known = foundPackages.get(key);
  if (known !== undefined) return known;
  const found = outwards(from)
    .map((place) => describePackage(place === '' ? `node_modules/${name}` : `${place}/node_modules/${name}`))
    .find((each) => each !== null);
  foundPackages.set(key, found ?? null);
  return found ?? null;
}

/** `node_modules/a/node_modules/b` gives itself, `node_modules/a` and the root. */
function outwards(place: string): string[] {
  const places = [place];
  for (let inner = place; inner !== ''; ) {
    inner = inner.slice(0, Math.max(0, inner.lastIndexOf('/node_modules/')));
    places.push(inner);
  }
  return places;
}

function describePackage(place: string): FoundPackage | null {
  if (lockFile === undefined) {
    lockFile = existsSync(lockPath) ? (JSON.parse(readFileSync(lockPath, 'utf8')) as LockFile) : null;
  }
  if (lockFile !== null) {
    const locked = lockFile.packages[place];
    return locked === undefined
      ? null
      : { place, version: locked.version ?? '', dependencies: locked.dependencies ?? {} };
  }
  const file = join(dirname(modulesFolder()), place, 'package.json');
  if (!existsSync(file)) return null;
  const installed = JSON.parse(readFileSync(file, 'utf8'));
  return { place, version: installed.version as string, dependencies: installed.dependencies ?? {} };
}
