/** The computation of `fit`: reads visibilities and basis, fits, writes the five outputs. */

import type { Numbers, Posterior, Visibilities } from '../data.ts';
import { readBasis } from '../formats/basis.ts';
import { writeJson, writeNumbers } from '../formats/json.ts';
import { writePosterior } from '../formats/posterior.ts';
import { writeSkyImage } from '../formats/sky-image.ts';
import { readVisibilities } from '../formats/visibilities.ts';
import type { StageReport, StageTask } from '../kind.ts';
import { quantiles } from '../numerics/statistics.ts';
import { imageAt } from './linear-model.ts';
import { drawPosterior } from './posterior-draws.ts';
import { makeReport } from './report.ts';
import { makeResiduals } from './residuals.ts';
import { runFit } from './run-fit.ts';
import { readSettings } from './settings.ts';

export function compute(task: StageTask): StageReport {
  const visibilities = readVisibilities(task.inputs.visibilities[0]);
  const basis = readBasis(task.inputs.basis[0]);
  const settings = readSettings(task.parameters, visibilities, basis.components.length);
  const result = runFit(visibilities, basis, settings, task.progress);
  const { problem, best, at, gains } = result;
  const posterior = drawPosterior(problem.model, best.x, best.curvature, settings.samples, settings.seed);
  const residuals = makeResiduals(settings.data, problem.data, problem.sets, at, gains);
  const report = makeReport(result, settings, posterior, residuals);
  const { nx, ny, pixelRadians } = basis;
  const pixels = imageAt(problem.model, basis, best.x);
  writeSkyImage(task.outputs.image, { nx, ny, pixelRadians, pixels });
  writePosterior(task.outputs.samples, posterior);
  writeJson(task.outputs.residuals, residuals);
  writeJson(task.outputs.report, report);
  writeNumbers(task.outputs.flux, fluxNumbers(posterior, visibilities, report.posterior));
  for (const term of report.terms) task.note(`chi-square of ${term.term}`, { ...term });
  task.note('fitted', { components: report.components, steps: best.steps, converged: best.converged });
  return { warnings: report.warnings };
}

function fluxNumbers(posterior: Posterior, visibilities: Visibilities, method: string): Numbers {
  const [low95, low, value, high, high95] = quantiles(posterior.flux, [0.025, 0.16, 0.5, 0.84, 0.975]);
  const definition =
    'Total flux of the image: median of the posterior with its 68 % and 95 % intervals. A gain common to all stations ' +
    'is held by its prior alone.';
  return {
    values: { flux: { value, unit: 'Jy', low, high, low95, high95, definition } },
    remarks: [`Posterior ${method}.`, ...(visibilities.remark ? [visibilities.remark] : [])],
  };
}
