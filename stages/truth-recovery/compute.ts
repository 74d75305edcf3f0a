/** The computation of `truth-recovery`. */

import type { Basis, Visibilities } from '../data.ts';
import { readBasis } from '../formats/basis.ts';
import { writeJson } from '../formats/json.ts';
import { readVisibilities } from '../formats/visibilities.ts';
import { compareModels } from '../imaging/geometric/compare-models.ts';
import { type AboutRing, aboutRing, ringIn, type SeenRing, withoutBias } from '../imaging/injected-rings.ts';
import { basisVisibilities, imageAt } from '../imaging/linear-model.ts';
import { LEAST_RINGS, type RingVerdict, ringVerdict } from '../imaging/ring-verdict.ts';
import { longestBaseline, selectRows } from '../imaging/select-rows.ts';
import type { FitSettings } from '../imaging/settings.ts';
import { runTrial, type Trial } from '../imaging/trial.ts';
import { visibleRings } from '../imaging/visible-rings.ts';
import type { StageReport, StageTask } from '../kind.ts';
import type { Model } from '../numerics/models.ts';
import { randomStream } from '../numerics/random.ts';
import { median } from '../numerics/statistics.ts';
import { correctedTrial, nearestBias, nearestTrials, type TrialNumbers } from './corrected-trial.ts';
import { TRUTH_FAMILIES, type TruthFamily } from './truth-families.ts';

interface Parameters {
  readonly each: number;
  readonly part: number;
  readonly noise: number;
  readonly flux: number;
  readonly components: number;
  readonly gains: number;
  readonly injections: number;
  readonly models: boolean;
  readonly seed: number;
}

const DRAWS = 60;
const INJECTION_DRAWS = 30;
const LIBRARY_STRIDE = 5;
/** As many as a stage of kind `injection` starts with. */
const PILOTS = 4;
/** Of the ring families one observation each is fitted in the other basis. */
const PULLED_FAMILIES = 12;

export function compute(task: StageTask): StageReport {
  const parameters = task.parameters as unknown as Parameters;
  const visibilities = readVisibilities(task.inputs.visibilities[0]);
  const basis = readBasis(task.inputs.basis[0]);
  const bench = makeBench(visibilities, basis, parameters);
  const planned = plan(parameters);
  const work = planned.length * (2 + 2 * parameters.injections);
  let done = 0;
  const step = (weight: number) => {
    done += weight;
    task.progress(Math.min(1, done / work));
  };
  const observed = planned.map(({ family, number }): Observed => {
    const { source, seed } = observationOf(family, number, parameters);
    const { result, ...trial } = bench(source, seed, DRAWS);
    const isDoubtful = !family.isRing || trial.ringFraction < LEAST_RINGS;
    const asks = parameters.models && (number === 0 || isDoubtful);
    const models = asks ? compareModels(result.problem, result.best.x) : null;
    step(2);
    return {
      family,
      number,
      trial,
      seen: ringIn({ ...basis, pixels: imageAt(result.problem.model, basis, result.best.x) }),
      ringPreferred: models?.ringPreferred ?? null,
      verdict: ringVerdict(trial.ringFraction, models),
    };
  });
  // As a stage of kind `injection` does: first about what was seen, then about that without its bias.
  const inject = (pilots: readonly TrialNumbers[]) =>
    observed.flatMap(({ family, number, seen, trial, verdict }) => {
      step(parameters.injections);
      if (seen === null || verdict !== 'ring') return [];
      const name = `${pilots.length > 0 ? 'injection' : 'pilot'} ${family.family} ${number}`;
      const about = aboutRing(withoutBias(seen, nearestTrials(pilots, trial, PILOTS)), basis);
      return ringsAbout(basis, about, name, parameters).map((source, k) => {
        const { result: _, ...rest } = bench(
          source,
          ownSeed(parameters.seed, `${name} ${k}`),
          INJECTION_DRAWS,
        );
        return rest;
      });
    });
  const pilots = inject([]);
  const injected = [...pilots, ...inject(pilots)];
  task.note('injected', { rings: injected.length });
  const trials = observed.map(({ family, trial, ringPreferred, verdict }) => ({
    family: family.family,
    isRing: family.isRing,
    ringFraction: trial.ringFraction,
    ringPreferred,
    verdict,
    ...correctedTrial(trial, nearestBias(injected, trial)),
  }));
  const pulls = task.inputs.otherBasis ? pullOf(task, parameters, visibilities, basis, planned) : [];
  writeJson(task.outputs.trials, {
    remark: 'All sources are invented.',
    noise: parameters.noise,
    components: parameters.components,
    injected: injected.length,
    trials,
    pulls,
  });
  return {};
}

/** Observes, fits and measures a source. */
function makeBench(visibilities: Visibilities, basis: Basis, { components, flux, gains, noise }: Parameters) {
  const settings: FitSettings = {
    data: 'closure-phases-and-amplitudes',
    components: Math.min(components, basis.components.length),
    priorWidth: 2,
    flux,
    fluxPrior: 0.5,
    shortest: 0.1,
    gainPriors: { usual: gains, stations: {} },
    minimumSnr: 2.5,
    positivity: 1,
    starts: 2,
    posterior: 'gaussian',
    sampler: { chains: 4, warmUp: 100, draws: 150, most: 600, rHat: 1.02, ess: 200 },
    samples: DRAWS,
    seed: 1,
  };
  const { data } = selectRows(
    visibilities,
    settings.shortest * 1e9,
    longestBaseline(basis.resolutionRadians),
  );
  const hints = { visibilities: basisVisibilities(basis, data.u, data.v), libraryStride: LIBRARY_STRIDE };
  const gainDeviations = new Float64Array(visibilities.stations.length).fill(gains);
  return (source: Model, seed: number, draws: number): Trial =>
    runTrial(visibilities, basis, source, settings, {
      seed,
      gainDeviations,
      draws,
      noiseFactor: noise,
      hints,
    });
}

interface Observed extends Planned {
  readonly trial: TrialNumbers;
  /** In the image of the optimum. */
  readonly seen: SeenRing | null;
  readonly ringPreferred: boolean | null;
  readonly verdict: RingVerdict;
}

interface Planned {
  readonly family: TruthFamily;
  readonly number: number;
}

/** All observations, or an even part of them; at least one. */
function plan({ each, part }: Parameters): Planned[] {
  const all = Array.from({ length: each }, (_, number) =>
    TRUTH_FAMILIES.flatMap((family) =>
      Array.from({ length: family.times }, (_, k) => ({ family, number: number * family.times + k })),
    ),
  ).flat();
  const count = Math.max(1, Math.round(part * all.length));
  return Array.from({ length: count }, (_, k) => all[Math.floor(((k + 0.5) * all.length) / count)]);
}

/** As a stage of kind `injection` would inject them, only fewer: neighbours lend theirs. */
function ringsAbout(
  basis: Basis,
  about: AboutRing,
  name: string,
  { injections, flux, seed }: Parameters,
): Model[] {
  return visibleRings(basis, { about, flux, count: injections, seed: ownSeed(seed, name) });
}

/** A source, and the seed of its noise and gains. Every observation has its own: were families to share one, they would share
 *  the error that it makes, and hundreds of observations would tell no more than a few. */
function observationOf({ family, make }: TruthFamily, number: number, { seed, flux }: Parameters) {
  const name = `${family} ${number}`;
  return {
    source: withFlux(make(randomStream(seed, `truth ${name}`)), flux),
    seed: ownSeed(seed, `observation ${name}`),
  };
}

function ownSeed(seed: number, name: string): number {
  return randomStream(seed, name).integer(0, 2147483647);
}

function withFlux(model: Model, flux: number): Model {
  return { ...model, parts: model.parts.map((part) => ({ ...part, flux: flux * part.flux })) };
}

/** How far the uncorrected diameter moves when the library holds no rings. */
function pullOf(
  task: StageTask,
  parameters: Parameters,
  visibilities: Visibilities,
  basis: Basis,
  planned: readonly Planned[],
) {
  const other = readBasis(task.inputs.otherBasis[0]);
  const [own, others] = [basis, other].map((each) => makeBench(visibilities, each, parameters));
  const rings = planned
    .filter(({ family, number }) => family.isRing && number === 0)
    .slice(0, PULLED_FAMILIES);
  return rings.map(({ family, number }) => {
    const { source, seed } = observationOf(family, number, parameters);
    const [a, b] = [own, others].map((bench) => bench(source, seed, DRAWS));
    const diameters = [a, b].map(({ draws, ringFraction }) =>
      ringFraction >= LEAST_RINGS ? median(draws.diameter) : null,
    );
    return {
      family: family.family,
      truth: a.truth?.diameter ?? null,
      withRings: diameters[0],
      withoutRings: diameters[1],
    };
  });
}
