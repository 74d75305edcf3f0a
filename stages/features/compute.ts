/** The computation of `features`: measures every draw and writes numbers and report. */

import { readBasis } from '../formats/basis.ts';
import { writeJson, writeNumbers } from '../formats/json.ts';
import { readPosterior } from '../formats/posterior.ts';
import { readSkyImage } from '../formats/sky-image.ts';
import { measureDraws } from '../imaging/measure-draws.ts';
import {
  type Calibration,
  LEAST_RINGS,
  makeRingNumbers,
  ringFraction,
  UAS_PER_RADIAN,
  widthViolated,
} from '../imaging/ring-numbers.ts';
import type { StageReport, StageTask } from '../kind.ts';
import { measureRing, RING_LIMITS, type RingMeasurement } from '../numerics/ring.ts';

export function compute(task: StageTask): StageReport {
  const basis = readBasis(task.inputs.basis[0]);
  const posterior = readPosterior(task.inputs.samples[0]);
  const draws = measureDraws(basis, posterior, task.progress);
  const numbers = makeRingNumbers(draws, task.parameters as Calibration, basis.resolutionRadians);
  const warnings = findWarnings(ringFraction(draws), widthViolated(numbers));
  const image = task.inputs.image?.[0];
  writeNumbers(task.outputs.ring, numbers);
  writeJson(task.outputs.report, {
    verdict: ringFraction(draws) >= LEAST_RINGS ? 'ring' : 'no ring',
    draws: draws.count,
    withRing: draws.rings.length,
    reasonsAgainst: draws.reasons,
    limits: RING_LIMITS,
    image: image ? inMicroarcsec(measureRing(readSkyImage(image))) : null,
    measures: draws.rings.map(inMicroarcsec),
    warnings,
  });
  task.note('measured', { draws: draws.count, withRing: draws.rings.length });
  return { warnings };
}

function findWarnings(fraction: number, violated: string | null): string[] {
  const warnings = violated === null ? [] : [violated];
  const percent = (100 * fraction).toFixed(0);
  if (!(fraction >= LEAST_RINGS)) return [`no ring: only ${percent} % of the draws have one`];
  return fraction < 0.95 ? [...warnings, `only ${percent} % of the draws have a ring`] : warnings;
}

/** A measurement with lengths in microarcseconds. */
function inMicroarcsec(ring: RingMeasurement) {
  const length = (value: number | null) => (value === null ? null : value * UAS_PER_RADIAN);
  return {
    ring: ring.ring,
    reasons: ring.reasons,
    centreEast: length(ring.centreEast),
    centreNorth: length(ring.centreNorth),
    diameter: length(ring.diameter),
    width: length(ring.width),
    asymmetry: ring.asymmetry,
    positionAngle: ring.positionAngleDegrees,
    centralDepression: ring.centralDepression,
    roundness: ring.roundness,
    thinRingDiameter: length(ring.thinRingDiameter),
    radiusScatter: ring.radiusScatter,
    missingInner: ring.missingInner,
    missingOuter: ring.missingOuter,
  };
}
