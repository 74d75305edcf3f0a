/** The ring in every draw of a posterior. */

import type { Basis, Posterior, SkyImage } from '../data.ts';
import { addCombination } from '../numerics/linear.ts';
import { measureRing, type RingMeasurement } from '../numerics/ring.ts';
import { InputProblem } from '../problem.ts';

export interface MeasuredDraws {
  readonly count: number;
  /** Measurements of the draws that have a ring, in their order. */
  readonly rings: readonly RingMeasurement[];
  /** How often each reason stood against a ring, by its first words. */
  readonly reasons: Readonly<Record<string, number>>;
}

/** Cost: about 2 ms a draw at 64 by 64 pixels. @throws InputProblem when basis and samples do not belong together */
export function measureDraws(
  basis: Basis,
  posterior: Posterior,
  progress: (fraction: number) => void = () => {},
): MeasuredDraws {
  requireFit(basis, posterior);
  const rings: RingMeasurement[] = [];
  const reasons: Record<string, number> = {};
  for (let s = 0; s < posterior.count; s++) {
    const measured = measureOrNone(drawImage(basis, posterior, s));
    if (measured === null) {
      count(reasons, 'no brightness');
    } else if (measured.ring) {
      rings.push(measured);
    } else {
      for (const reason of measured.reasons) count(reasons, withoutNumbers(reason));
    }
    if (s % 20 === 0) progress(s / posterior.count);
  }
  return { count: posterior.count, rings, reasons };
}

function requireFit(basis: Basis, posterior: Posterior): void {
  if (!(posterior.components <= basis.components.length)) {
    throw new InputProblem({
      code: 'wrong-shape',
      place: 'input samples',
      expected: `at most ${basis.components.length} coefficients a draw, the components of the basis`,
      found: `${posterior.components}`,
      advice: 'Give the basis with which the fit was made.',
    });
  }
  if (!(posterior.count >= 2)) {
    throw new InputProblem({
      code: 'too-few-draws',
      place: 'input samples',
      expected: 'at least two draws',
      found: `${posterior.count}`,
      advice: 'Raise the parameter `samples` of the fit.',
    });
  }
}

/** Image of one draw, Jy per pixel. */
export function drawImage(basis: Basis, posterior: Posterior, s: number): SkyImage {
  const { nx, ny, pixelRadians } = basis;
  const K = posterior.components;
  const pixels = basis.mean.map((value) => posterior.flux[s] * value);
  addCombination(pixels, basis.components, posterior.coefficients.subarray(s * K, (s + 1) * K));
  return { nx, ny, pixelRadians, pixels };
}

/** An image without any positive pixel has nothing to measure. */
function measureOrNone(image: SkyImage): RingMeasurement | null {
  return image.pixels.some((value) => value > 0) ? measureRing(image) : null;
}

function withoutNumbers(reason: string): string {
  return reason
    .replace(/\s*(on|by) \d+ %.*$/, '')
    .replace(/has \d+ % of.*$/, 'is not dark enough')
    .trim();
}

function count(reasons: Record<string, number>, reason: string): void {
  reasons[reason] = (reasons[reason] ?? 0) + 1;
}
