/** The computation of `injection`. */

import { readBasis } from '../formats/basis.ts';
import { writeJson } from '../formats/json.ts';
import { readSkyImage } from '../formats/sky-image.ts';
import { readVisibilities } from '../formats/visibilities.ts';
import { gainDeviations } from '../imaging/fit-problem.ts';
import { type AboutRing, aboutRing, ringIn, withoutBias } from '../imaging/injected-rings.ts';
import { basisVisibilities } from '../imaging/linear-model.ts';
import { biasOf, isUsable } from '../imaging/method-bias.ts';
import { pointsOf } from '../imaging/points.ts';
import { longestBaseline, selectRows, wantedData } from '../imaging/select-rows.ts';
import { runTrial, type Trial } from '../imaging/trial.ts';
import { visibleRings } from '../imaging/visible-rings.ts';
import type { StageReport, StageTask } from '../kind.ts';
import { readUsedSettings } from './used-settings.ts';

/** Draws of each trial's posterior: their 68 % interval is then good to a sixth. */
const DRAWS = 30;
/** One ring in so many is injected about what was seen; the others about that without the bias which the first ones show. */
const PILOTS = 3;
/** One library image in so many is tried as a start. */
const LIBRARY_STRIDE = 5;

export function compute(task: StageTask): StageReport {
  const { count, starts, seed } = task.parameters as { count: number; starts: number; seed: number };
  const visibilities = readVisibilities(task.inputs.visibilities[0]);
  const basis = readBasis(task.inputs.basis[0]);
  const settings = readUsedSettings(task.inputs.report[0], starts);
  const image = readSkyImage(task.inputs.image[0]);
  const seen = ringIn(image);
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
  if (seen !== null) {
    const about = aboutRing(seen, basis);
    const inject = (ring: AboutRing, rings: number, round: number) => {
      for (const source of visibleRings(basis, {
        about: ring,
        flux,
        count: rings,
        seed: seed + 1000 * round,
      })) {
        const used = trials.filter(isUsable).length;
        if (used === count) break;
        const options = { seed: seed + trials.length, gainDeviations: deviations, draws: DRAWS, hints };
        trials.push(runTrial(visibilities, basis, source, settings, options));
        task.progress(Math.max(used / count, trials.length / (2 * count)));
      }
    };
    const first = Math.ceil(count / PILOTS);
    inject(about, first, 0);
    const nearer = aboutRing(withoutBias(seen, trials), basis);
    inject(nearer, count - first, 1);
    if (trials.filter(isUsable).length < count) inject(nearer, count, 2);
  }
  const bias = biasOf(trials);
  const lost = trials.filter((trial) => trial.truth !== null && !isUsable(trial));
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
    warnings: warningsOf(seen === null, bias === null, {
      wanted: count,
      injected: trials.length,
      lost: lost.length,
    }),
  };
}

function warningsOf(
  isWithoutRing: boolean,
  isWithout: boolean,
  { wanted, injected, lost }: { wanted: number; injected: number; lost: number },
): string[] {
  if (isWithoutRing) return ["the fit's image has no ring, so nothing was injected and no bias is known"];
  if (isWithout) {
    return [
      `of ${wanted} rings ${injected} could be injected (the others are none at the basis's resolution) and ` +
        `${injected - lost} came out as rings: too few, no bias is known`,
    ];
  }
  return lost > injected / 4 ? [`${lost} of ${injected} injected rings did not come out as rings`] : [];
}
