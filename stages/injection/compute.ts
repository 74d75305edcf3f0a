/** The computation of `injection`. */

import type { SkyImage } from '../data.ts';
import { readBasis } from '../formats/basis.ts';
import { writeJson } from '../formats/json.ts';
import { readSkyImage } from '../formats/sky-image.ts';
import { readVisibilities } from '../formats/visibilities.ts';
import { gainDeviations } from '../imaging/fit-problem.ts';
import type { AboutRing } from '../imaging/injected-rings.ts';
import { basisVisibilities } from '../imaging/linear-model.ts';
import { biasOf } from '../imaging/method-bias.ts';
import { pointsOf } from '../imaging/points.ts';
import { longestBaseline, selectRows, wantedData } from '../imaging/select-rows.ts';
import { runTrial, type Trial } from '../imaging/trial.ts';
import type { StageReport, StageTask } from '../kind.ts';
import { measureRing } from '../numerics/ring.ts';
import { readUsedSettings } from './used-settings.ts';
import { visibleRings } from './visible-rings.ts';

/** Draws of each trial's posterior: their 68 % interval is then good to a sixth. */
const DRAWS = 30;
/** One library image in so many is tried as a start. */
const LIBRARY_STRIDE = 5;

export function compute(task: StageTask): StageReport {
  const { count, starts, seed } = task.parameters as { count: number; starts: number; seed: number };
  const visibilities = readVisibilities(task.inputs.visibilities[0]);
  const basis = readBasis(task.inputs.basis[0]);
  const settings = readUsedSettings(task.inputs.report[0], starts);
  const image = readSkyImage(task.inputs.image[0]);
  const about = ringIn(image, basis.resolutionRadians);
  const { data } = selectRows(
    wantedData(visibilities, settings.data),
    settings.shortest * 1e9,
    longestBaseline(basis.resolutionRadians),
  );
  const points = pointsOf(data);
  const hints = {
    visibilities: basisVisibilities(basis, points.u, points.v),
    libraryStride: LIBRARY_STRIDE,
  };
  const deviations = gainDeviations(visibilities, settings.gainPriors);
  const trials: Trial[] = [];
  const flux = image.pixels.reduce((sum, value) => sum + value, 0);
  if (about !== null) {
    visibleRings(basis, { about, flux, count, seed }).forEach((source, k) => {
      const options = { seed: seed + k, gainDeviations: deviations, draws: DRAWS, hints };
      trials.push(runTrial(visibilities, basis, source, settings, options));
      task.progress((k + 1) / count);
    });
  }
  const bias = biasOf(trials);
  const lost = trials.filter(
    ({ truth, measured, ringFraction }) => truth && !(measured && ringFraction >= 0.5),
  );
  writeJson(task.outputs.bias, {
    remark: 'The injected sources are invented.',
    injected: trials.length,
    used: bias === null ? 0 : bias.diameter.trials,
    lost: lost.length,
    bias,
    trials: trials.map(({ truth, measured, ringFraction }) => ({ truth, measured, ringFraction })),
  });
  task.note('injected', { trials: trials.length, used: bias?.diameter.trials ?? 0, lost: lost.length });
  return {
    warnings: warningsOf(about, bias === null, { wanted: count, injected: trials.length, lost: lost.length }),
  };
}

function warningsOf(
  about: AboutRing | null,
  isWithout: boolean,
  { wanted, injected, lost }: { wanted: number; injected: number; lost: number },
): string[] {
  if (about === null) return ["the fit's image has no ring, so nothing was injected and no bias is known"];
  if (isWithout) {
    return [
      `of ${wanted} rings ${injected} could be injected (the others are none at the basis's resolution) and ` +
        `${injected - lost} came out as rings: too few, no bias is known`,
    ];
  }
  return lost > injected / 4 ? [`${lost} of ${injected} injected rings did not come out as rings`] : [];
}

/** The thin ring that was measured, and its width without the basis's resolution; null where there is no ring. */
function ringIn(image: SkyImage, resolution: number): AboutRing | null {
  if (!image.pixels.some((value) => value > 0)) return null;
  const { ring, width, thinRingDiameter, diameter, asymmetry } = measureRing(image);
  if (!ring || width === null) return null;
  const sharp = Math.sqrt(Math.max(width * width - resolution * resolution, (width * width) / 9));
  return { diameter: thinRingDiameter ?? diameter, width: sharp, asymmetry };
}
