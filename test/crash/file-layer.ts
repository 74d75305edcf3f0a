/** A layer over node:fs that counts every step by which a program changes files below one directory, and can stop the
 *  program at any of them. It replaces the functions of node:fs themselves, so whatever code runs on top is not changed
 *  and need not know.
 *
 *      steps       create, link, rename, unlink, write, truncate, chmod, fsync (of files and of directories)
 *      stops       'kill'   the process kills itself (SIGKILL) just before a step; 'kill half', when a write is half done
 *                  'die'    the same without a death: the step and all that follow throw and change nothing
 *                  'fail'   the step throws an error of the file system, once or from then on
 *      sabotage    the program's syncs or its order of writing are broken on purpose, to see the harness notice
 *
 *  Files and directories have numbers of the layer's own: a name may come to stand for another file, a number never.
 *  Only the synchronous functions are covered; liveFiles() lets a test make sure that nothing went past the layer. What
 *  SQLite does with its files is not seen. */

import fs from 'node:fs';
import { syncBuiltinESMExports } from 'node:module';
import { basename, dirname, join, relative, resolve } from 'node:path';
import { fileURLToPath } from 'node:url';

interface Place {
  readonly directory: number;
  readonly name: string;
}

export type Step =
  | { readonly op: 'create'; readonly id: number; readonly at: Place; readonly kind: 'file' | 'directory' }
  | { readonly op: 'link'; readonly id: number; readonly at: Place }
  | { readonly op: 'rename'; readonly id: number; readonly from: Place; readonly to: Place }
  | { readonly op: 'unlink'; readonly id: number; readonly at: Place }
  | { readonly op: 'write'; readonly id: number; readonly offset: number; readonly bytes: Buffer }
  | { readonly op: 'truncate'; readonly id: number; readonly size: number }
  | { readonly op: 'chmod'; readonly id: number; readonly mode: number }
  | { readonly op: 'fsync'; readonly id: number };

/** The root directory's number. */
export const ROOT = 0;

export interface Stop {
  /** The number of a step, from 1. */
  readonly at: number;
  readonly how: 'kill' | 'kill half' | 'die' | 'die half' | 'fail' | 'fail from then on';
  /** For 'fail': an error code of the system, such as ENOSPC. */
  readonly code?: string;
}

export type Sabotage = 'no file sync' | 'no directory sync' | 'rename before write';

export interface LayerOptions {
  /** Everything below it is watched. */
  readonly root: string;
  readonly stop?: Stop;
  readonly sabotage?: Sabotage;
  /** Hears of each step when it is done. */
  readonly onStep?: (step: Step, number: number, path: string) => void;
}

export interface Layer {
  /** Steps so far, those that were stopped not among them. */
  steps(): number;
  /** What is stopped from now on; step numbers count on. */
  stopAt(stop: Stop | null): void;
  /** Whether the program would be dead. */
  died(): boolean;
  /** Takes the layer away. */
  remove(): void;
}

/** What is thrown in place of a death. */
export class Died extends Error {
  override readonly name = 'Died';
}

const original = { ...fs };
const ERRNO: Readonly<Record<string, number>> = { EIO: -5, EACCES: -13, ENOSPC: -28, EROFS: -30 };
/** What needs no room on a disk. */
const ROOMLESS = new Set<Step['op']>(['unlink', 'truncate', 'chmod', 'fsync', 'rename']);

interface OpenFile {
  readonly id: number;
  readonly path: string;
  readonly appends: boolean;
  position: number;
}

/** Lays the layer over node:fs. One at a time. */
export function installLayer({ root: given, stop: firstStop, sabotage, onStep }: LayerOptions): Layer {
  const root = resolve(given);
  const ids = new Map<string, number>([[root, ROOT]]);
  const open = new Map<number, OpenFile>();
  /** For 'rename before write': what waits until the file has its name, by path. */
  const deferred = new Map<string, (() => void)[]>();
  let nextId = ROOT + 1;
  let count = 0;
  let stop = firstStop ?? null;
  let dead = false;

  for (const path of walk(root)) ids.set(path, nextId++);

  const isWatched = (path: string) => path === root || path.startsWith(`${root}/`);
  const placeOf = (path: string): Place => {
    const directory = ids.get(dirname(path));
    if (directory === undefined) throw new Error(`the layer does not know ${dirname(path)}`);
    return { directory, name: basename(path) };
  };

  /** One step: counted, perhaps stopped, done, told. @param half  for writes: does the first half */
  function take<T>(step: Step, path: string, perform: () => T, half?: () => void): T {
    if (dead) throw new Died();
    const number = count + 1;
    if (stop !== null && (number === stop.at || (stop.how === 'fail from then on' && number > stop.at)))
      endOrFail(stop, step, path, half);
    const result = perform();
    count = number;
    onStep?.(step, number, path);
    return result;
  }

  function endOrFail({ how, code = 'EIO' }: Stop, step: Step, path: string, half?: () => void): void {
    if (how.endsWith('half')) half?.();
    if (how === 'kill' || how === 'kill half') {
      process.kill(process.pid, 'SIGKILL');
      for (;;);
    }
    if (how.startsWith('die')) {
      dead = true;
      throw new Died();
    }
    if (how === 'fail from then on' && code === 'ENOSPC' && ROOMLESS.has(step.op)) return;
    // A disk that is full takes the first bytes.
    if (code === 'ENOSPC') half?.();
    throw systemError(code, step.op, path);
  }

  function create(
    path: string,
    kind: 'file' | 'directory',
    perform: () => number | undefined,
  ): number | undefined {
    const id = nextId;
    const result = take({ op: 'create', id, at: placeOf(path), kind }, path, perform);
    nextId += 1;
    ids.set(path, id);
    return result;
  }

  function openSync(path: fs.PathLike, flags: fs.OpenMode = 'r', mode?: fs.Mode | null): number {
    const at = pathOf(path);
    const wanted = typeof flags === 'number' ? flagsOf(flags) : String(flags);
    if (!isWatched(at)) return original.openSync(path, flags, mode);
    const writes = wanted !== 'r' && wanted !== 'rs';
    const exists = original.existsSync(at);
    const opens = () => original.openSync(at, flags, mode ?? undefined);
    // What is read again before it has its name cannot wait.
    if (!writes) flush(at);
    let descriptor: number;
    if (writes && !exists && !wanted.startsWith('r')) descriptor = create(at, 'file', opens) as number;
    else {
      const id = ids.get(at);
      if (id === undefined) return opens();
      const empties = wanted.startsWith('w') && !wanted.includes('x') && original.statSync(at).size > 0;
      descriptor = empties ? take({ op: 'truncate', id, size: 0 }, at, opens) : opens();
    }
    const id = ids.get(at) as number;
    open.set(descriptor, { id, path: at, appends: wanted.startsWith('a'), position: 0 });
    return descriptor;
  }

  function closeSync(descriptor: number): void {
    const file = open.get(descriptor);
    open.delete(descriptor);
    const waiting = file === undefined ? undefined : deferred.get(file.path);
    if (waiting === undefined) original.closeSync(descriptor);
    else waiting.push(() => original.closeSync(descriptor));
  }

  function writeSync(descriptor: number, data: NodeJS.ArrayBufferView | string, ...rest: unknown[]): number {
    const file = open.get(descriptor);
    if (file === undefined)
      return (original.writeSync as (...all: unknown[]) => number)(descriptor, data, ...rest);
    const { bytes, position } = writeArguments(data, rest);
    const write = () => writeBytes(descriptor, file, Buffer.from(bytes), position);
    if (sabotage !== 'rename before write' || file.appends) return write();
    deferred.set(file.path, [...(deferred.get(file.path) ?? []), write]);
    return bytes.length;
  }

  function writeBytes(descriptor: number, file: OpenFile, bytes: Buffer, position: number | null): number {
    const offset = file.appends ? original.fstatSync(descriptor).size : (position ?? file.position);
    const perform = (part: Buffer) =>
      original.writeSync(descriptor, part, 0, part.length, file.appends ? null : offset);
    const step: Step = { op: 'write', id: file.id, offset, bytes };
    const done = take(
      step,
      file.path,
      () => perform(bytes),
      () => {
        const part = bytes.subarray(0, Math.floor(bytes.length / 2));
        perform(part);
        onStep?.({ op: 'write', id: file.id, offset, bytes: part }, count, file.path);
      },
    );
    if (position === null && !file.appends) file.position = offset + done;
    return done;
  }

  function fsyncSync(descriptor: number): void {
    const file = open.get(descriptor);
    if (file === undefined) {
      original.fsyncSync(descriptor);
      return;
    }
    const skipped = original.fstatSync(descriptor).isDirectory() ? 'no directory sync' : 'no file sync';
    if (sabotage === skipped) return;
    // Nothing is synced in truth: a killed process loses nothing by it, and a power cut is only a model here.
    const sync = () => take({ op: 'fsync', id: file.id }, file.path, () => undefined);
    const waiting = deferred.get(file.path);
    if (waiting === undefined) sync();
    else waiting.push(sync);
  }

  function ftruncateSync(descriptor: number, size: number | null = 0): void {
    const file = open.get(descriptor);
    const perform = () => original.ftruncateSync(descriptor, size ?? 0);
    if (file === undefined) perform();
    else take({ op: 'truncate', id: file.id, size: size ?? 0 }, file.path, perform);
  }

  function fchmodSync(descriptor: number, mode: fs.Mode): void {
    const file = open.get(descriptor);
    const perform = () => original.fchmodSync(descriptor, mode);
    if (file === undefined) perform();
    else take({ op: 'chmod', id: file.id, mode: Number(mode) }, file.path, perform);
  }

  function chmodSync(path: fs.PathLike, mode: fs.Mode): void {
    const id = ids.get(pathOf(path));
    const perform = () => original.chmodSync(path, mode);
    if (id === undefined) perform();
    else take({ op: 'chmod', id, mode: Number(mode) }, pathOf(path), perform);
  }

  function renameSync(from: fs.PathLike, to: fs.PathLike): void {
    const [source, target] = [pathOf(from), pathOf(to)];
    const id = ids.get(source);
    if (id === undefined || !isWatched(target)) {
      original.renameSync(from, to);
      return;
    }
    const step: Step = { op: 'rename', id, from: placeOf(source), to: placeOf(target) };
    take(step, target, () => original.renameSync(from, to));
    ids.delete(source);
    ids.set(target, id);
    flush(source);
  }

  function flush(path: string): void {
    for (const perform of deferred.get(path) ?? []) perform();
    deferred.delete(path);
  }

  function linkSync(from: fs.PathLike, to: fs.PathLike): void {
    const [source, target] = [pathOf(from), pathOf(to)];
    const id = ids.get(source);
    const perform = () => original.linkSync(from, to);
    if (id === undefined || !isWatched(target)) {
      perform();
      return;
    }
    if (original.existsSync(target)) perform();
    take({ op: 'link', id, at: placeOf(target) }, target, perform);
    ids.set(target, id);
  }

  function unlinkSync(path: fs.PathLike): void {
    const at = pathOf(path);
    const id = ids.get(at);
    if (id === undefined || !original.existsSync(at)) {
      original.unlinkSync(path);
      return;
    }
    take({ op: 'unlink', id, at: placeOf(at) }, at, () => original.unlinkSync(at));
    ids.delete(at);
  }

  function rmSync(path: fs.PathLike, options: fs.RmOptions = {}): void {
    const at = pathOf(path);
    if (!ids.has(at) || !original.existsSync(at)) original.rmSync(path, options);
    else if (original.statSync(at).isDirectory()) throw new Error('the layer removes no directories');
    else unlinkSync(at);
  }

  function mkdirSync(
    path: fs.PathLike,
    options?: fs.MakeDirectoryOptions | fs.Mode | null,
  ): string | undefined {
    const at = pathOf(path);
    const recursive = typeof options === 'object' && options?.recursive === true;
    if (!isWatched(at) || (original.existsSync(at) && !recursive))
      return original.mkdirSync(path, options as never);
    if (original.existsSync(at)) return undefined;
    const first = recursive ? mkdirSync(dirname(at), options) : undefined;
    const mode = typeof options === 'object' ? (options?.mode ?? 0o777) : (options ?? 0o777);
    create(at, 'directory', () => {
      original.mkdirSync(at, { mode });
      return undefined;
    });
    return first ?? at;
  }

  function writeFileSync(
    file: fs.PathOrFileDescriptor,
    data: string | NodeJS.ArrayBufferView,
    options?: fs.WriteFileOptions,
  ): void {
    const { flag = 'w', mode = 0o666 } = typeof options === 'object' && options !== null ? options : {};
    const descriptor = typeof file === 'number' ? file : openSync(file, flag, mode);
    try {
      const { bytes } = writeArguments(data, []);
      for (let done = 0; done < bytes.length; )
        done += writeSync(descriptor, bytes, done, bytes.length - done);
    } finally {
      if (typeof file !== 'number') closeSync(descriptor);
    }
  }

  function appendFileSync(path: fs.PathOrFileDescriptor, data: string | Uint8Array): void {
    writeFileSync(path, data, { flag: 'a' });
  }

  function copyFileSync(from: fs.PathLike, to: fs.PathLike, mode = 0): void {
    if (!isWatched(pathOf(to))) original.copyFileSync(from, to, mode);
    else
      writeFileSync(to, original.readFileSync(from), {
        flag: mode & fs.constants.COPYFILE_EXCL ? 'wx' : 'w',
      });
  }

  const layered = {
    openSync,
    closeSync,
    writeSync,
    fsyncSync,
    fdatasyncSync: fsyncSync,
    ftruncateSync,
    fchmodSync,
    chmodSync,
    renameSync,
    linkSync,
    unlinkSync,
    rmSync,
    mkdirSync,
    writeFileSync,
    appendFileSync,
    copyFileSync,
  };
  replace(layered);
  return {
    steps: () => count,
    stopAt(next) {
      stop = next;
      dead = false;
    },
    died: () => dead,
    remove() {
      replace(
        Object.fromEntries(
          Object.keys(layered).map((name) => [name, original[name as keyof typeof layered]]),
        ),
      );
    },
  };
}

/** Also for those who import functions by name. */
function replace(functions: object): void {
  Object.assign(fs, functions);
  syncBuiltinESMExports();
}

/** Every file below a directory with its bytes, by relative path; directories have null. Databases are left out. */
export function liveFiles(root: string): Map<string, Buffer | null> {
  const files = new Map<string, Buffer | null>();
  for (const path of walk(root)) {
    const isDirectory = original.statSync(path).isDirectory();
    files.set(relative(root, path), isDirectory ? null : original.readFileSync(path));
  }
  return files;
}

/** Paths below a directory, parents first, sorted. */
function* walk(directory: string): Generator<string> {
  for (const entry of original
    .readdirSync(directory, { withFileTypes: true })
    .sort((a, b) => (a.name < b.name ? -1 : 1))) {
    if (entry.name.includes('.sqlite')) continue;
    const path = join(directory, entry.name);
    yield path;
    if (entry.isDirectory()) yield* walk(path);
  }
}

function pathOf(path: fs.PathLike): string {
  return resolve(path instanceof URL ? fileURLToPath(path) : String(path));
}

function flagsOf(flags: number): string {
  const { O_WRONLY, O_RDWR, O_APPEND, O_TRUNC, O_CREAT } = fs.constants;
  if ((flags & (O_WRONLY | O_RDWR)) === 0) return 'r';
  if (flags & O_APPEND) return 'a';
  return flags & (O_TRUNC | O_CREAT) ? 'w' : 'r+';
}

/** The bytes and the position of a call of writeSync, in any of its forms. */
function writeArguments(
  data: NodeJS.ArrayBufferView | string,
  rest: readonly unknown[],
): { bytes: Buffer; position: number | null } {
  if (typeof data === 'string') {
    return {
      bytes: Buffer.from(data, (rest[1] as BufferEncoding) ?? 'utf8'),
      position: numberOr(rest[0], null),
    };
  }
  const [first, length, position] =
    typeof rest[0] === 'object' && rest[0] !== null
      ? [
          (rest[0] as { offset?: number }).offset,
          (rest[0] as { length?: number }).length,
          (rest[0] as { position?: number }).position,
        ]
      : rest;
  const whole = Buffer.from(data.buffer, data.byteOffset, data.byteLength);
  const start = numberOr(first, 0);
  return {
    bytes: whole.subarray(start, start + numberOr(length, whole.length - start)),
    position: numberOr(position, null),
  };
}

function numberOr<T>(value: unknown, otherwise: T): number | T {
  return typeof value === 'number' ? value : otherwise;
}

function systemError(code: string, syscall: string, path: string): NodeJS.ErrnoException {
  const error: NodeJS.ErrnoException = new Error(`${code}: made to fail, ${syscall} '${path}'`);
  return Object.assign(error, { code, errno: ERRNO[code] ?? -5, syscall, path });
}
