/** The computation of `features`: measures every draw and writes numbers and report. */

import type { Basis } from '../data.ts';
import { readBasis } from '../formats/basis.ts';
import { writeJson, writeNumbers } from '../formats/json.ts';
import { readPosterior, readVariants } from '../formats/posterior.ts';
import { readSkyImage } from '../formats/sky-image.ts';
import type { Calibration } from '../imaging/calibrated-ring.ts';
import { deepestDepression } from '../imaging/deepest-depression.ts';
import { errorParts, partsRemark } from '../imaging/error-parts.ts';
import { UAS_PER_RADIAN } from '../imaging/intervals.ts';
import { type MeasuredDraws, measureDraws } from '../imaging/measure-draws.ts';
import { makeRingNumbers, ringFraction, widthViolated } from '../imaging/ring-numbers.ts';
import { type ModelsVerdict, ringVerdict } from '../imaging/ring-verdict.ts';
import type { StageReport, StageTask } from '../kind.ts';
import { measureRing, RING_LIMITS, type RingMeasurement } from '../numerics/ring.ts';
import { median } from '../numerics/statistics.ts';
import { readBias, readModels, readOthers } from './other-inputs.ts';

export function compute(task: StageTask): StageReport {
  const basis = readBasis(task.inputs.basis[0]);
  const posterior = readPosterior(task.inputs.samples[0]);
  const draws = measureDraws(basis, posterior, task.progress);
  const bias = task.inputs.bias ? readBias(task.inputs.bias) : null;
  const models = task.inputs.models ? readModels(task.inputs.models[0]) : null;
  const parts = errorParts(draws, {
    basis,
    variants: readVariants(task.inputs.samples[0]),
    others: readOthers(task.inputs.otherBasis ?? [], task.inputs.otherSamples ?? []),
    bias: bias?.diameter ?? null,
  });
  const found = makeRingNumbers(draws, task.parameters as Calibration, {
    resolutionRadians: basis.resolutionRadians,
    bias,
    models,
    parts,
    deepest: deepestOf(draws, basis),
  });
  const numbers =
    'diameter' in found.values ? { ...found, remarks: [...found.remarks, partsRemark(parts)] } : found;
  const verdict = ringVerdict(ringFraction(draws), models);
  const warnings = findWarnings(ringFraction(draws), widthViolated(numbers), models);
  const image = task.inputs.image?.[0];
  writeNumbers(task.outputs.ring, numbers);
  writeJson(task.outputs.report, {
    verdict,
    draws: draws.count,
    withRing: draws.rings.length,
    reasonsAgainst: draws.reasons,
    limits: RING_LIMITS,
    models,
    bias,
    diameterErrors: parts,
    image: image ? inMicroarcsec(measureRing(readSkyImage(image))) : null,
    measures: draws.rings.map(inMicroarcsec),
    warnings,
  });
  task.note('measured', { draws: draws.count, withRing: draws.rings.length });
  return { warnings };
}

function findWarnings(fraction: number, violated: string | null, models: ModelsVerdict | null): string[] {
  const warnings = violated === null ? [] : [violated];
  const percent = (100 * fraction).toFixed(0);
  const verdict = ringVerdict(fraction, models);
  if (verdict === 'undecided')
    return [`undecided: ${percent} % of the draws have a ring, but ${models?.sentence}`];
  if (verdict === 'no ring') {
    const isOfModels = models !== null && !models.ringPreferred;
    return [isOfModels ? `no ring: ${models.sentence}` : `no ring: only ${percent} % of the draws have one`];
  }
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

/** Of the diameter and width that were measured; null without a ring. */
function deepestOf({ rings }: MeasuredDraws, basis: Basis): number | null {
  const widths = rings.flatMap(({ width }) => width ?? []);
  if (widths.length === 0) return null;
  return deepestDepression(
    median(rings.map((ring) => ring.thinRingDiameter ?? ring.diameter)),
    median(widths),
    basis,
  );
}
