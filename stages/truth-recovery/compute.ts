/** The computation of `truth-recovery`. */

import type { Basis, Visibilities } from '../data.ts';
import { readBasis } from '../formats/basis.ts';
import { writeJson } from '../formats/json.ts';
import { readVisibilities } from '../formats/visibilities.ts';
import { compareModels } from '../imaging/geometric/compare-models.ts';
import { injectedRings } from '../imaging/injected-rings.ts';
import { basisVisibilities } from '../imaging/linear-model.ts';
import { LEAST_RINGS } from '../imaging/ring-numbers.ts';
import { longestBaseline, selectRows } from '../imaging/select-rows.ts';
import type { FitSettings } from '../imaging/settings.ts';
import { runTrial, type Trial } from '../imaging/trial.ts';
import type { StageReport, StageTask } from '../kind.ts';
import type { Model } from '../numerics/models.ts';
import { randomStream } from '../numerics/random.ts';
import { median } from '../numerics/statistics.ts';
import { correctedTrial, nearestBias } from './corrected-trial.ts';
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
/** Injected rings are drawn about three sizes, so that all are near some. */
const ABOUT = [36, 45, 55];
const UAS = Math.PI / (180 * 3600e6);
/** Of the ring families one observation each is fitted in the other basis. */
const PULLED_FAMILIES = 12;

export function compute(task: StageTask): StageReport {
  const parameters = task.parameters as unknown as Parameters;
  const visibilities = readVisibilities(task.inputs.visibilities[0]);
  const basis = readBasis(task.inputs.basis[0]);
  const bench = makeBench(visibilities, basis, parameters);
  const planned = plan(parameters);
  const work = parameters.injections + 3 * planned.length;
  let done = 0;
  const step = (weight: number) => {
    done += weight;
    task.progress(Math.min(1, done / work));
  };
  const injected = sourcesToInject(parameters).map((source, k) => {
    const trial = bench(source, parameters.seed + 5000 + k, INJECTION_DRAWS);
    step(1);
    return trial;
  });
  task.note('injected', { rings: injected.length });
  const trials = planned.map(({ family, number }) => {
    const random = randomStream(parameters.seed, `truth ${family.family} ${number}`);
    const trial = bench(withFlux(family.make(random), parameters.flux), parameters.seed + 97 * number, DRAWS);
    const verdict = parameters.models ? compareModels(trial.result.problem, trial.result.best.x) : null;
    step(3);
    const isFound = trial.ringFraction >= LEAST_RINGS && (verdict?.ringPreferred ?? true);
    return {
      family: family.family,
      isRing: family.isRing,
      ringFraction: trial.ringFraction,
      ringPreferred: verdict?.ringPreferred ?? null,
      isFound,
      ...correctedTrial(trial, nearestBias(injected, trial)),
    };
  });
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

interface Planned {
  readonly family: TruthFamily;
  readonly number: number;
}

/** All observations, or an even part of them; at least one. */
function plan({ each, part }: Parameters): Planned[] {
  const all = Array.from({ length: each }, (_, number) =>
    TRUTH_FAMILIES.map((family) => ({ family, number })),
  ).flat();
  const count = Math.max(1, Math.round(part * all.length));
  return Array.from({ length: count }, (_, k) => all[Math.floor(((k + 0.5) * all.length) / count)]);
}

function sourcesToInject({ injections, flux, seed }: Parameters): Model[] {
  return ABOUT.flatMap((diameter, k) => {
    const count = Math.ceil((injections - k) / ABOUT.length);
    const about = { diameter: diameter * UAS, width: 11 * UAS, asymmetry: 0.15 };
    return injectedRings(about, flux, count, seed + 1000 + k);
  });
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
    const source = withFlux(
      family.make(randomStream(parameters.seed, `truth ${family.family} ${number}`)),
      parameters.flux,
    );
    const [a, b] = [own, others].map((bench) => bench(source, parameters.seed + 97 * number, DRAWS));
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
