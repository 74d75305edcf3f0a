/** What is different between two runs, and what it did to the results. Stages are matched by their names. */

import type { Book } from './book.ts';
import type {
  FailureEntry,
  Json,
  Origin,
  PublishedNumber,
  RecordedInput,
  RunEntry,
  StageEntry,
} from './entry.ts';
import { jsonDifferences, namesOf } from './json-differences.ts';
import { withdrawalsOfNumber, withdrawnUpstream } from './withdrawal.ts';

type Pair<T> = readonly [T, T];
/** Null where a run has none. */
type Either<T> = Pair<T | null>;

export interface DiffDocument {
  readonly runs: Pair<number>;
  readonly recipe: { readonly same: boolean; readonly names: Pair<string>; readonly digests: Pair<string> };
  /** Stages that only one run has, or that are of another kind. */
  readonly stages: readonly { readonly stage: string; readonly kinds: Either<string> }[];
  /** Parameters by dotted path. */
  readonly parameters: readonly {
    readonly stage: string;
    readonly parameter: string;
    readonly values: Either<Json>;
  }[];
  readonly inputs: readonly DiffInput[];
  readonly code: readonly DiffCode[];
  readonly environment: readonly {
    readonly name: 'runtime' | 'platform';
    readonly values: Pair<string>;
    readonly stages: readonly string[];
  }[];
  readonly outputs: readonly {
    readonly stage: string;
    readonly output: string;
    readonly same: boolean;
    readonly digests: Either<string>;
  }[];
  readonly numbers: readonly DiffNumber[];
  /** Withdrawals that stand of something that one of the runs depends on. */
  readonly withdrawals: readonly {
    readonly run: number;
    /** The withdrawal's entry. */
    readonly entry: number;
    readonly withdraws: number;
    readonly reason: string;
  }[];
}

export interface DiffInput {
  readonly stage: string;
  readonly input: string;
  /** True when it comes from another stage in both runs: it differs because that stage's output does. */
  readonly derived: boolean;
  readonly digests: Either<readonly string[]>;
  readonly origins: Either<readonly Origin[]>;
}

export interface DiffCode {
  readonly stage: string;
  readonly kind: string;
  readonly digests: Pair<string>;
  readonly versions: Pair<number>;
  /** Files that differ or that only one has. */
  readonly files: readonly string[];
  readonly packages: readonly { readonly name: string; readonly versions: Either<string> }[];
}

export interface DiffNumber {
  readonly name: string;
  readonly values: Either<number>;
  readonly units: Either<string>;
  /** The second less the first; null when one is missing or the units differ. */
  readonly shift: number | null;
  /** The shift in quadrature means of the half-widths of both 68 % intervals; null when there is none. */
  readonly sigmas: number | null;
  readonly intervals: Either<Pair<number>>;
  /** Numbers of the withdrawals that the value in each run depends on. */
  readonly withdrawn: Pair<readonly number[]>;
}

type Executed = StageEntry | FailureEntry;
interface StagePair {
  readonly stage: string;
  readonly a: Executed;
  readonly b: Executed;
}

/** The differences from run a to run b. Cost: one line read per stage of each. */
export function diffRuns(book: Book, a: RunEntry, b: RunEntry): DiffDocument {
  const [first, second] = [executedIn(book, a), executedIn(book, b)];
  const pairs: StagePair[] = [];
  for (const [stage, entry] of first) {
    const other = second.get(stage);
    if (other !== undefined) pairs.push({ stage, a: entry, b: other });
  }
  return {
    runs: [a.run, b.run],
    recipe: {
      same: a.recipe.digest === b.recipe.digest,
      names: [a.recipe.name, b.recipe.name],
      digests: [a.recipe.digest, b.recipe.digest],
    },
    stages: stageDifferences(a, b),
    parameters: pairs.flatMap(parameterDifferences),
    inputs: pairs.flatMap(inputDifferences),
    code: pairs.flatMap(codeDifferences),
    environment: environmentDifferences(pairs),
    outputs: pairs.flatMap(outputDifferences),
    numbers: namesOf(
      a.numbers.map(({ name }) => name),
      b.numbers.map(({ name }) => name),
    ).map((name) => numberDifference(book, name, a, b)),
    withdrawals: [...new Set([a, b])].flatMap((run) => withdrawalsFor(book, run)),
  };
}

function executedIn(book: Book, run: RunEntry): Map<string, Executed> {
  const executed = new Map<string, Executed>();
  for (const { stage, entry } of run.stages) {
    if (entry !== null) executed.set(stage, book.entry(entry) as Executed);
  }
  return executed;
}

function stageDifferences(a: RunEntry, b: RunEntry): DiffDocument['stages'] {
  const kindIn = (run: RunEntry, name: string) =>
    run.stages.find(({ stage }) => stage === name)?.kind ?? null;
  const names = namesOf(
    a.stages.map(({ stage }) => stage),
    b.stages.map(({ stage }) => stage),
  );
  return names
    .map((stage) => ({ stage, kinds: [kindIn(a, stage), kindIn(b, stage)] as const }))
    .filter(({ kinds: [x, y] }) => x !== y);
}

// Parameters

function parameterDifferences({ stage, a, b }: StagePair): DiffDocument['parameters'] {
  const differences = jsonDifferences('', a.parameters, b.parameters);
  // A seed that is no parameter of its own.
  if (a.seed !== b.seed && !('seed' in a.parameters) && !('seed' in b.parameters)) {
    differences.push({ parameter: 'seed', values: [a.seed, b.seed] });
  }
  return differences.map((difference) => ({ stage, ...difference }));
}

// Inputs, code, environment, outputs

function inputDifferences({ stage, a, b }: StagePair): DiffInput[] {
  return namesOf(Object.keys(a.inputs), Object.keys(b.inputs)).flatMap((input) => {
    const pair: Either<readonly RecordedInput[]> = [a.inputs[input] ?? null, b.inputs[input] ?? null];
    const [x, y] = pair.map((list) => list?.map(({ digest }) => digest) ?? null) as [
      string[] | null,
      string[] | null,
    ];
    if (x?.join() === y?.join()) return [];
    const origins = pair.map((list) => list?.map(({ origin }) => origin) ?? null) as [
      Origin[] | null,
      Origin[] | null,
    ];
    const derived = origins.every((list) => list?.every((origin) => 'entry' in origin) === true);
    return [{ stage, input, derived, digests: [x, y], origins }];
  });
}

function codeDifferences({ stage, a, b }: StagePair): DiffCode[] {
  const [x, y] = [a.code, b.code];
  if (x.digest === y.digest) return [];
  const files = namesOf(Object.keys(x.files), Object.keys(y.files)).filter(
    (path) => x.files[path] !== y.files[path],
  );
  const packages = namesOf(Object.keys(x.packages), Object.keys(y.packages))
    .map((name) => ({ name, versions: [x.packages[name] ?? null, y.packages[name] ?? null] as const }))
    .filter(({ versions: [p, q] }) => p !== q);
  return [
    {
      stage,
      kind: b.kind,
      digests: [x.digest, y.digest],
      versions: [x.version, y.version],
      files,
      packages,
    },
  ];
}

function environmentDifferences(pairs: readonly StagePair[]): DiffDocument['environment'] {
  const found = new Map<string, { name: 'runtime' | 'platform'; values: Pair<string>; stages: string[] }>();
  for (const { stage, a, b } of pairs) {
    const both = [
      { name: 'runtime', values: [a.code.runtime, b.code.runtime] },
      { name: 'platform', values: [a.platform, b.platform] },
    ] as const;
    for (const { name, values } of both) {
      if (values[0] === values[1]) continue;
      const known = found.get(`${name} ${values}`) ?? { name, values, stages: [] };
      known.stages.push(stage);
      found.set(`${name} ${values}`, known);
    }
  }
  return [...found.values()];
}

function outputDifferences({ stage, a, b }: StagePair): DiffDocument['outputs'] {
  const [x, y] = [outputsOf(a), outputsOf(b)];
  return namesOf(Object.keys(x), Object.keys(y)).map((output) => {
    const digests = [x[output]?.digest ?? null, y[output]?.digest ?? null] as const;
    return { stage, output, same: digests[0] === digests[1], digests };
  });
}

function outputsOf(entry: Executed): StageEntry['outputs'] {
  return entry.type === 'stage' ? entry.outputs : {};
}

// Numbers

function numberDifference(book: Book, name: string, runA: RunEntry, runB: RunEntry): DiffNumber {
  const find = (run: RunEntry) => run.numbers.find((number) => number.name === name) ?? null;
  const [a, b] = [find(runA), find(runB)];
  const shift = a !== null && b !== null && a.unit === b.unit ? b.value - a.value : null;
  const width = Math.sqrt(halfWidth(a) ** 2 + halfWidth(b) ** 2);
  return {
    name,
    values: [a?.value ?? null, b?.value ?? null],
    units: [a?.unit ?? null, b?.unit ?? null],
    shift,
    sigmas: shift !== null && width > 0 ? shift / width : null,
    intervals: [intervalOf(a), intervalOf(b)],
    withdrawn: [withdrawalsOfValue(book, runA, a), withdrawalsOfValue(book, runB, b)],
  };
}

function withdrawalsOfValue(book: Book, run: RunEntry, number: PublishedNumber | null): number[] {
  return number === null ? [] : withdrawalsOfNumber(book, run.number, number.entry);
}

function withdrawalsFor(book: Book, { run, number }: RunEntry): DiffDocument['withdrawals'] {
  return withdrawnUpstream(book, number).map(({ number: entry, withdraws, reason }) => ({
    run,
    entry,
    withdraws,
    reason,
  }));
}

/** Half the width of the 68 % interval; 0 without one. */
function halfWidth(number: PublishedNumber | null): number {
  const interval = intervalOf(number);
  return interval === null ? 0 : (interval[1] - interval[0]) / 2;
}

function intervalOf(number: PublishedNumber | null): Pair<number> | null {
  return number === null || number.low === null || number.high === null ? null : [number.low, number.high];
}
