/** The computation of `fit`: reads visibilities and basis, fits, writes the six outputs. */

import type { Posterior } from '../data.ts';
import { readBasis } from '../formats/basis.ts';
import { writeJson, writeNumbers } from '../formats/json.ts';
import { writePosterior } from '../formats/posterior.ts';
import { writeSkyImage } from '../formats/sky-image.ts';
import { readVisibilities } from '../formats/visibilities.ts';
import { compareModels } from '../imaging/geometric/compare-models.ts';
import { imageAt } from '../imaging/linear-model.ts';
import { drawPosterior, withStatedFlux } from '../imaging/posterior-draws.ts';
import { posteriorVariants } from '../imaging/posterior-variants.ts';
import { runFit } from '../imaging/run-fit.ts';
import { samplePosterior } from '../imaging/sampler.ts';
import { isLinear, measuresFlux, readSettings } from '../imaging/settings.ts';
import type { StageReport, StageTask } from '../kind.ts';
import { fluxNumbers } from './flux-numbers.ts';
import { holdOutBaselines, leaveOutStations } from './left-out.ts';
import { makeReport } from './report.ts';
import { makeResiduals } from './residuals.ts';

export function compute(task: StageTask): StageReport {
  const visibilities = readVisibilities(task.inputs.visibilities[0]);
  const basis = readBasis(task.inputs.basis[0]);
  const settings = readSettings(task.parameters, visibilities, basis.components.length);
  const result = runFit(visibilities, basis, settings, (fraction) => task.progress(fraction / 2));
  const { problem, best, at, gains } = result;
  const sampled =
    settings.posterior === 'sampled' && !isLinear(settings)
      ? samplePosterior(problem, best, gains, settings.sampler, {
          count: settings.samples,
          seed: settings.seed,
          progress: (fraction) => task.progress(0.5 + 0.45 * fraction),
        })
      : null;
  const spread = <T extends Posterior>(draws: T) =>
    measuresFlux(settings) ? draws : withStatedFlux(draws, settings.fluxPrior, settings.seed);
  const posterior = spread(
    sampled?.posterior ??
      drawPosterior(problem.model, best.x, best.curvature, settings.samples, settings.seed),
  );
  const residuals = makeResiduals(settings.data, problem.data, problem.sets, at, gains);
  const report = makeReport(result, settings, posterior, {
    sampler: sampled?.report ?? null,
    leftOut: leaveOutStations(result, settings),
    heldOut: holdOutBaselines(result, settings),
  });
  const { nx, ny, pixelRadians } = basis;
  const pixels = imageAt(problem.model, basis, best.x);
  writeSkyImage(task.outputs.image, { nx, ny, pixelRadians, pixels });
  writePosterior(task.outputs.samples, posterior, {
    ...(sampled ? { chain: sampled.posterior.chain } : {}),
    variants: posteriorVariants(result, settings.seed).map(({ role, posterior: draws }) => ({
      role,
      posterior: spread(draws),
    })),
  });
  writeJson(task.outputs.residuals, residuals);
  writeJson(task.outputs.report, report);
  const models = compareModels(problem, best.x);
  writeJson(task.outputs.models, models);
  writeNumbers(task.outputs.flux, fluxNumbers(basis, posterior, report.posterior, visibilities.remark));
  for (const term of report.terms) task.note(`chi-square of ${term.term}`, { ...term });
  if (sampled) {
    const { rHat, essBulk, essTail, divergences, draws, met } = sampled.report;
    task.note('sampled', { rHat, essBulk, essTail, divergences, draws, met });
  }
  task.note('models', { preferred: models.preferred, ...models.margin });
  task.note('fitted', { components: report.components, steps: best.steps, converged: best.converged });
  return { warnings: report.warnings };
}
