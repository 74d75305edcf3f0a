/** Computation of the kind `basis-build`: files in and out. What is computed: build.ts. */

import type { ByteSink, ByteSource } from '../bytes.ts';
import { writeBasis } from '../formats/basis.ts';
import { writeJson } from '../formats/json.ts';
import type { StageReport, StageTask } from '../kind.ts';
import { InternalError } from '../problem.ts';
import { type Build, buildBasis, TAPER_CUT } from './build.ts';
import { openLibrary } from './library.ts';
import { makeTally, type Tally } from './tally.ts';

const UAS = Math.PI / 180 / 3600 / 1e6;

interface BasisParameters {
  readonly components: number;
  /** uas */
  readonly resolution: number;
  readonly heldOut: number;
}

/** Builds a basis. @throws InputProblem as openLibrary and buildBasis */
export function compute(task: StageTask): StageReport {
  const parameters = task.parameters as unknown as BasisParameters;
  const library = openLibrary(input(task, 'library'), input(task, 'manifest'));
  const tally = makeTally(parameters.components);
  const build = buildBasis(
    library,
    {
      components: parameters.components,
      resolutionRadians: parameters.resolution * UAS,
      heldOut: parameters.heldOut,
      progress: task.progress,
    },
    (projection) => tally.add(projection, library.families[projection.image] as string),
  );
  writeBasis(output(task, 'basis'), build.basis);
  const report = reportOf(build, tally, parameters, library.count);
  writeJson(output(task, 'report'), report);
  const explained = report.explained.at(-1) as number;
  task.note(`${parameters.components} components explain ${(100 * explained).toFixed(2)} % of the variance`, {
    modes: build.modes,
    images: library.count,
  });
  return {};
}

function reportOf({ basis, modes }: Build, tally: Tally, parameters: BasisParameters, images: number) {
  let sum = 0;
  const explained = Array.from(basis.eigenvalues, (value) => {
    sum += value;
    return sum / basis.totalVariance;
  });
  return {
    images,
    inBasis: basis.families.length,
    heldOut: images - basis.families.length,
    resolutionUas: parameters.resolution,
    taperCut: TAPER_CUT,
    modes,
    components: parameters.components,
    totalVariance: basis.totalVariance,
    eigenvalues: basis.eigenvalues,
    explained,
    heldOutExplained: tally.heldOutExplained(),
    heldOutFamilies: tally.families(),
  };
}

function input(task: StageTask, name: string): ByteSource {
  const source = task.inputs[name]?.[0];
  if (!source) throw new InternalError('basis-build', `no source for the input ${name}`);
  return source;
}

function output(task: StageTask, name: string): ByteSink {
  const sink = task.outputs[name];
  if (!sink) throw new InternalError('basis-build', `no sink for the output ${name}`);
  return sink;
}
