/** A book of many runs, for benchmarks: ten stages a run, most of them carried forward, ten entries a run on average.
 *  Written through the ledger's own formatters in one go, without a sync and without an index for each entry.
 *
 *  The history is invented. A group tries settings of its basis and its fit on one release of data, then the next
 *  release comes; every 10,000 runs there is a new library. Of ten runs (100 entries) one reads new data, seven change
 *  the basis, two the fit; in every tenth ten one fails, in every hundredth there are reruns, a withdrawal and a
 *  countersignature. Code, parameters and sizes of entries are those of the real kinds. Files of the store are few, and
 *  shared: only their digests and sizes matter here. */

import type { KeyObject } from 'node:crypto';
import { closeSync, openSync, writeFileSync, writeSync } from 'node:fs';
import { join } from 'node:path';
import { openBook } from '../../ledger/book.ts';
import { canonicalJson } from '../../ledger/canonical.ts';
import { signEntry } from '../../ledger/countersignature.ts';
import { DIGEST_OF_NOTHING, sha256 } from '../../ledger/digest.ts';
import type {
  Draft,
  Json,
  Person,
  PublishedNumber,
  RecordedCode,
  RunDraft,
  StageState,
  StoredFile,
} from '../../ledger/entry.ts';
import { keptPath } from '../../ledger/kept-seals.ts';
import { growPeaks, leafHash, rootOfPeaks } from '../../ledger/merkle.ts';
import { plateNumbersOf } from '../../ledger/plate-number.ts';
import { signSeal, writeSeal } from '../../ledger/seal.ts';
import { readOrMakeSigningKey } from '../../ledger/signing-key.ts';
import type { Store } from '../../ledger/store.ts';
import { treePath } from '../../ledger/tree.ts';
import { codeOfKind } from '../../runner/code-digest.ts';
import { kindsFolder } from '../../runner/program.ts';
import { keepCode } from '../../runner/recorded-code/keep.ts';
import { stageKinds } from '../../stages/kinds.ts';
import { parametersOf, STAGES, type StageName, warningsOf } from './ten-stages.ts';

/** What a benchmark asks for. */
export interface Landmarks {
  readonly entries: number;
  readonly runs: number;
  readonly bytes: number;
  readonly oldestPlate: string;
  readonly newestPlate: string;
  /** The file from which the library of so many runs was made: its digest, and the runs that used it. */
  readonly libraryFile: { readonly digest: string; readonly runs: number };
  /** A release of data that ten runs or so used. */
  readonly release: string;
  readonly recipe: string;
  /** A number of components that one run in sixteen has. */
  readonly components: number;
  /** A day in the middle. */
  readonly day: string;
}

const BOOK = 'lantern';
const KEEPERS: readonly Person[] = ['A. Keeper', 'B. Keeper', 'C. Keeper'].map((name) => ({ name }));
const START = Date.UTC(2026, 0, 5);
/** Between entries: a million of them take 9.5 years. */
const STEP_MILLISECONDS = 300_000;
const RUNS_OF_LIBRARY = 10_000;
const RUNS_OF_CODE = 2000;
const RECIPES = 20;
const FILES = 10_000;
const BLOCK = 1 << 23;

/** Fills a new book with `entries` entries, a multiple of 100. @param key  the file of the signing key */
export function writeManyRuns(directory: string, entries: number, key: string): Landmarks {
  const by = KEEPERS[0] as Person;
  const book = openBook(directory, { by, name: BOOK, create: true, key });
  const shelf = makeShelf(book.store, Math.min(FILES, entries));
  const codes = makeCodes(book.store);
  book.close();
  const pen = makePen(directory, readOrMakeSigningKey(key).key);
  const history = makeHistory(pen, shelf, codes);
  const runs = entries / 10;
  while (pen.count() < entries) history.tenRuns();
  const bytes = pen.finish();
  const firstLibrary = sha256('library 0');
  return {
    entries,
    runs,
    bytes,
    ...history.landmarks(),
    libraryFile: { digest: firstLibrary, runs: Math.min(runs, RUNS_OF_LIBRARY) },
    recipe: recipeName(7),
    components: 30,
    day: new Date(START + (entries / 2) * STEP_MILLISECONDS).toISOString().slice(0, 10),
  };
}

// Content

function makeShelf(store: Store, count: number): readonly StoredFile[] {
  return Array.from({ length: count }, (_, i) => store.keepBytes(`Invented output ${i} of a benchmark.\n`));
}

/** The record of each kind's code and its canonical text, by kind and by how often it has changed. */
function makeCodes(store: Store): (kind: string, changes: number) => string {
  const known = new Map<string, string>();
  const codes = new Map<string, RecordedCode>(
    stageKinds.map(({ kind, version }) => [
      kind,
      keepCode(store, kindsFolder, kind, codeOfKind(kindsFolder, kind, version)),
    ]),
  );
  return (kind, changes) => {
    const key = `${kind} ${changes}`;
    let text = known.get(key);
    if (text === undefined) {
      const code = codes.get(kind) as RecordedCode;
      // A third-party package with another version.
      const packages = { ...code.packages, pino: `10.${changes}.0` };
      text = canonicalJson({ ...code, packages, digest: sha256(key) } as unknown as Json);
      known.set(key, text);
    }
    return text;
  };
}

function recipeName(run: number): string {
  return `lantern-${run % RECIPES}`;
}

// The history

interface Made {
  readonly entry: number;
  readonly outputs: Readonly<Record<string, StoredFile & { readonly format: string }>>;
}

interface Plate {
  readonly name: string;
  readonly plate: string;
  readonly entry: number;
}

/** What a run computes; everything else is carried forward. */
const NEW_DATA: readonly StageName[] = [
  'visibilities',
  'calibration',
  'fit',
  'ring-model',
  'features',
  'pictures',
  'diagnostics',
  'combination',
];
const NEW_BASIS: readonly StageName[] = [
  'basis',
  'fit',
  'features',
  'pictures',
  'diagnostics',
  'combination',
];
const NEW_FIT: readonly StageName[] = ['fit', 'features', 'pictures', 'diagnostics', 'combination'];
const ALL: readonly StageName[] = STAGES.map(({ name }) => name);

const FIGURES = [
  { name: 'ring-image', stage: 'pictures', output: 'image' },
  { name: 'data', stage: 'diagnostics', output: 'data' },
  { name: 'posterior', stage: 'diagnostics', output: 'posterior' },
  { name: 'scree', stage: 'diagnostics', output: 'scree' },
] as const;

function makeHistory(
  pen: Pen,
  shelf: readonly StoredFile[],
  codes: (kind: string, changes: number) => string,
) {
  const made = new Map<StageName, Made>();
  const plates = new Map<string, Plate>();
  let run = 0;
  let releases = 0;
  let oldestPlate = '';
  let newestPlate = '';
  let signer: { key: KeyObject; by: Person } | null = null;

  const pick = (i: number): StoredFile => shelf[(pen.count() * 31 + i * 7919) % shelf.length] as StoredFile;

  /** Enters one stage. @param failed  as a failure, which makes nothing */
  const enterStage = (name: StageName, failed = false): number => {
    const stage = STAGES.find((each) => each.name === name) as (typeof STAGES)[number];
    const inputs: Record<string, Json> = {};
    for (const [input, from, output] of stage.inputs) {
      const source = made.get(from) as Made;
      const file = source.outputs[output] as Made['outputs'][string];
      inputs[input] = [{ digest: file.digest, bytes: file.bytes, origin: { entry: source.entry, output } }];
    }
    const outside =
      name === 'visibilities'
        ? `release ${releases}`
        : name === 'library'
          ? `library ${libraryOf(run)}`
          : null;
    if (outside !== null) {
      const path = `data/${outside.replace(' ', '-')}.uvfits`;
      inputs.data = [{ digest: sha256(outside), bytes: 57_600, origin: { file: path } }];
    }
    const parameters = parametersOf(name, run);
    const outputs = Object.fromEntries(
      stage.outputs.map(([output, format], i) => [output, { ...pick(i), format }]),
    );
    const number = pen.count() + 1;
    const seed = 'seed' in parameters ? parameters.seed : null;
    const record = {
      name,
      kind: stage.kind,
      key: sha256(`key ${number}`),
      code: null,
      inputs,
      parameters,
      seed,
      seconds: 2.065 + (number % 977) / 500,
      peakMemory: 126_873_600 + (number % 31) * 4096,
      log: pick(99),
      platform: 'linux-x64',
    };
    const draft = failed
      ? {
          type: 'failure',
          ...record,
          error: {
            code: 'no-fit',
            message: 'An invented error: the fit found no optimum in 200 iterations.',
          },
        }
      : {
          type: 'stage',
          ...record,
          outputs,
          findings: stage.findings ?? [],
          warnings: warningsOf(name, run),
          stop: null,
          mark: null,
        };
    const digest = pen.enter(draft as unknown as Draft, codes(stage.kind, Math.floor(run / RUNS_OF_CODE)));
    if (!failed) {
      made.set(name, { entry: number, outputs });
      if (name === 'pictures' || name === 'diagnostics') enterPlateNumbers(name, number, digest);
    }
    return number;
  };

  const drawn = new Map<StageName, ReadonlyMap<string, string>>();
  const enterPlateNumbers = (name: StageName, number: number, digest: string) => {
    drawn.set(name, plateNumbersOf(number, digest, (made.get(name) as Made).outputs));
  };

  const enterPlates = (count: number) => {
    for (const { name, stage, output } of FIGURES.slice(0, count)) {
      const { entry, outputs } = made.get(stage) as Made;
      const plate = drawn.get(stage)?.get(output) as string;
      const number = pen.count() + 1;
      pen.enter({
        type: 'plate',
        plate,
        name,
        drawn: entry,
        output,
        figure: (outputs[output] as StoredFile).digest,
        stamped: { svg: pick(1), png: pick(2) },
        mark: null,
      });
      plates.set(name, { name, plate, entry: number });
      if (oldestPlate === '') oldestPlate = plate;
      newestPlate = plate;
    }
  };

  const enterRun = (computed: readonly StageName[], failedAt: number | null = null) => {
    const recipe = recipeName(run);
    const stages: RunDraft['stages'] = STAGES.map(({ name, kind }) => {
      const state = (entry: number | null, what: StageState) => ({ stage: name, kind, state: what, entry });
      if (failedAt !== null && name === 'fit') return state(failedAt, 'failed');
      if (failedAt !== null && NEW_FIT.includes(name)) return state(null, 'not reached');
      return state(made.get(name)?.entry ?? null, computed.includes(name) ? 'computed' : 'carried forward');
    });
    pen.enter({
      type: 'run',
      run,
      recipe: { ...(shelf[run % RECIPES] as StoredFile), name: recipe, path: `recipes/${recipe}.yaml` },
      overrides: computed.includes('fit')
        ? [{ stage: 'fit', parameter: 'components', text: String(parametersOf('fit', run).components) }]
        : [],
      stages,
      plates: failedAt === null ? [...plates.values()].slice(0, 3) : [],
      numbers: failedAt === null ? numbersOf(made, run) : [],
      finished: failedAt === null,
    } as unknown as Draft);
  };

  const oneRun = (computed: readonly StageName[], plateCount = 3) => {
    run += 1;
    const isNewLibrary = (run - 1) % RUNS_OF_LIBRARY === 0;
    if (computed === NEW_DATA) releases += 1;
    const names = isNewLibrary ? ALL : computed;
    for (const { name } of STAGES) if (names.includes(name)) enterStage(name);
    // Whatever a run computes more, it publishes less: ten runs are a hundred entries.
    enterPlates(plateCount - (names.length - computed.length));
    enterRun(names);
  };

  const failedRun = (withBasis: boolean) => {
    run += 1;
    if (withBasis) enterStage('basis');
    enterRun(withBasis ? ['basis'] : [], enterStage('fit', true));
  };

  /** In place of a run of nine entries. */
  const administration = () => {
    const fit = (made.get('fit') as Made).entry;
    for (let i = 0; i < 5; i += 1) {
      const outputs = ['image', 'samples', 'flux'].map((output, j) => {
        const { digest } = pick(j);
        return { stage: 'fit', output, verdict: 'identical', was: digest, is: digest, largestDeviation: 0 };
      });
      pen.enter({
        type: 'rerun',
        of: fit,
        verdict: 'identical',
        outputs,
        differences: [],
      } as unknown as Draft);
    }
    const basis = (made.get('basis') as Made).entry;
    pen.enter({
      type: 'withdrawal',
      withdraws: basis,
      reason: 'An invented reason: the basis was built from a library with a wrong pixel size.',
    });
    signer ??= { key: pen.key, by: KEEPERS[1] as Person };
    pen.enter(signEntry({ name: BOOK, digestOf: pen.digestOf } as never, pen.count(), signer.by, signer.key));
    failedRun(false);
  };

  return {
    /** A hundred entries. */
    tenRuns() {
      const ten = run / 10;
      oneRun(NEW_DATA);
      if (ten % 10 === 9 && ten % 100 !== 50) {
        for (let i = 0; i < 5; i += 1) oneRun(NEW_BASIS);
        oneRun(NEW_BASIS, 4);
        failedRun(true);
        oneRun(NEW_DATA);
        oneRun(NEW_DATA);
      } else {
        for (let i = 0; i < 7; i += 1) oneRun(NEW_BASIS);
        oneRun(NEW_FIT);
        if (ten % 100 === 50) administration();
        else oneRun(NEW_FIT);
      }
    },
    landmarks: () => ({
      oldestPlate,
      newestPlate,
      release: sha256(`release ${Math.max(1, Math.floor(releases / 2))}`),
    }),
  };
}

function libraryOf(run: number): number {
  return Math.floor((run - 1) / RUNS_OF_LIBRARY);
}

function numbersOf(made: ReadonlyMap<StageName, Made>, run: number): PublishedNumber[] {
  const number = (
    name: string,
    stage: StageName,
    output: string,
    key: string,
    value: number,
    unit: string,
  ): PublishedNumber => ({
    name,
    value,
    low: value - 0.107,
    high: value + 0.146,
    unit,
    entry: (made.get(stage) as Made).entry,
    output,
    key,
    against: null,
    tolerance: 0.01,
  });
  const drift = ((run * 7919) % 1000) / 1000;
  return [
    number('ring-diameter', 'features', 'ring', 'diameter', 41.147 + drift, 'uas'),
    number('ring-width', 'features', 'ring', 'width', 12.31 + drift / 3, 'uas'),
    number('compact-flux', 'fit', 'flux', 'flux', 0.768 + drift / 20, 'Jy'),
  ];
}

// Writing

interface Pen {
  readonly key: KeyObject;
  count(): number;
  digestOf(number: number): string;
  /** Adds the book's fields and writes the line. @param code  canonical text that stands for `code: null`
   *  @returns the entry's digest */
  enter(draft: Draft, code?: string): string;
  /** @returns the ledger's bytes */
  finish(): number;
}

function makePen(directory: string, key: KeyObject): Pen {
  const ledger = makeSink(join(directory, 'ledger.jsonl'));
  const tree = makeSink(treePath(directory));
  const kept = makeSink(keptPath(directory));
  const peaks: Buffer[] = [];
  let number = 0;
  let last = DIGEST_OF_NOTHING;
  let time = '';
  let note: string | null = null;
  const seal = () =>
    signSeal(
      {
        book: BOOK,
        bytes: ledger.bytes(),
        entries: number,
        last,
        root: rootOfPeaks(peaks).toString('base64'),
        time,
      },
      key,
    );
  return {
    key,
    count: () => number,
    digestOf: () => last,
    enter(draft, code) {
      // The seal of a run is kept when the next entry comes.
      if (note !== null) kept.write(Buffer.from(note));
      note = null;
      time = new Date(START + number * STEP_MILLISECONDS).toISOString();
      const by = KEEPERS[Math.floor(number / 1000) % KEEPERS.length] as Person;
      const text = canonicalJson({
        ...draft,
        book: BOOK,
        number: number + 1,
        before: last,
        time,
        by,
      } as unknown as Json);
      const line = Buffer.from(
        `${code === undefined ? text : text.replace('"code":null', () => `"code":${code}`)}\n`,
      );
      const entry = line.subarray(0, -1);
      last = sha256(entry);
      for (const hash of growPeaks(peaks, number, leafHash(entry))) tree.write(hash);
      ledger.write(line);
      number += 1;
      if (draft.type === 'run') note = seal().note;
      return last;
    },
    finish() {
      writeSeal(directory, seal());
      tree.close();
      kept.close();
      return ledger.close();
    },
  };
}

function makeSink(path: string) {
  const descriptor = openSync(path, 'w');
  const block = Buffer.allocUnsafe(BLOCK);
  let used = 0;
  let bytes = 0;
  const flush = () => {
    writeSync(descriptor, block, 0, used);
    used = 0;
  };
  return {
    write(part: Buffer) {
      if (used + part.length > BLOCK) flush();
      used += part.copy(block, used);
      bytes += part.length;
    },
    bytes: () => bytes,
    close() {
      flush();
      closeSync(descriptor);
      return bytes;
    },
  };
}

/** Writes the landmarks beside a book, so that it can be measured again. */
export function writeLandmarks(path: string, landmarks: Landmarks): void {
  writeFileSync(path, JSON.stringify(landmarks, null, 2));
}
