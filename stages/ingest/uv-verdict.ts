/** What follows from the comparison of (u,v) with the station positions: an error, or the words of the report. */

import { InputProblem } from '../problem.ts';
import type { Choices } from './choices.ts';
import type { UvAgreement } from './records.ts';
import { type Comparison, GOOD_AGREEMENT, POOR_AGREEMENT } from './uv-agreement.ts';

/** Fewest and most wavelengths of the longest baseline between telescopes on Earth: a few metres at 10 µm would be
 *  3e5, but baselines that short make no image here; 12 756 km at 1 mm are 1.28e10. Common practice. */
const LEAST_WAVELENGTHS = 1e6;
const MOST_WAVELENGTHS = 1.3e10;

export interface UvVerdict {
  readonly agreement: UvAgreement;
  /** Factor on u and v as the format counts them: −1 to turn them round. */
  readonly turn: 1 | -1;
  readonly warnings: readonly string[];
}

/** Judges a comparison.
 *  @param must  whether (u,v) that cannot be checked, or agree with neither sign, are an error
 *  @throws InputProblem when `uvSign` is `check` and the sign is wrong, or, with `must`, not to be confirmed */
export function judgeUv(
  comparison: Comparison | undefined,
  uvSign: Choices['uvSign'],
  place: string,
  must: boolean,
): UvVerdict {
  const turn = uvSign === 'reversed' ? -1 : 1;
  const applied =
    uvSign === 'reversed' ? 'turned round, as the parameter uvSign says' : 'taken as the format counts them';
  const fits = comparison !== undefined && comparison.largest < POOR_AGREEMENT;
  if (uvSign === 'check') refuse(comparison, fits, place, must);
  const warnings = comparison === undefined ? [] : warningsOf(comparison, fits, turn, uvSign);
  const agreement: UvAgreement = {
    checked: comparison !== undefined,
    largest: comparison?.largest ?? null,
    rms: comparison?.rms ?? null,
    rows: comparison?.rows ?? 0,
    finding: findingOf(comparison, fits),
    applied,
    exchanged: comparison?.exchanged ?? null,
    clock: fits ? comparison.clock : null,
  };
  return { agreement, turn, warnings };
}

function refuse(comparison: Comparison | undefined, fits: boolean, place: string, must: boolean): void {
  if (comparison === undefined) {
    if (must) throw uncheckable(place);
    return;
  }
  if (fits && comparison.sign < 0) throw wrongSign(comparison, place);
  if (!must) return;
  if (fits && comparison.mirrored) throw mirrored(place);
  // Stations that stand exchanged are a finding that stops the run: it names them.
  if (!fits && comparison.exchanged === null) throw disagreement(comparison, place);
}

function uncheckable(place: string): InputProblem {
  return new InputProblem({
    code: 'uv-unchecked',
    place,
    expected: 'station positions with which to check the sign of u and v',
    found: 'an antenna table in which all positions are the same',
    advice:
      'Supply the positions; or set the parameter uvSign to as-written or reversed if you know the sign.',
  });
}

function wrongSign(comparison: Comparison, place: string): InputProblem {
  return new InputProblem({
    code: 'uv-sign',
    place,
    expected: 'u and v with the sign of their format, as computed from the station positions',
    found: `the opposite sign (turned round they agree to ${comparison.largest.toExponential(1)} of the longest baseline)`,
    advice:
      'The picture would be turned by 180°: set the parameter uvSign to reversed, or to as-written to keep the sign.',
  });
}

function mirrored(place: string): InputProblem {
  return new InputProblem({
    code: 'uv-mirrored',
    place,
    expected: 'station positions with y to the east (right-handed)',
    found: 'u and v that agree with positions whose y points to the west',
    advice: "Give the antenna table the keyword XYZHAND = 'LEFT', or correct its positions.",
  });
}

function disagreement(comparison: Comparison, place: string): InputProblem {
  return new InputProblem({
    code: 'uv-disagrees',
    place: `${place}, row ${comparison.worstRow + 1} of those used`,
    expected: `u and v within ${POOR_AGREEMENT} of the longest baseline of those computed from the station positions`,
    found: `a difference of ${comparison.largest.toPrecision(3)}`,
    advice:
      'Likely causes: times, reference date (RDATE, GSTIA0) or positions of another observation. Correct the file, or set uvSign to as-written or reversed if you know the sign.',
  });
}

function warningsOf(
  comparison: Comparison,
  fits: boolean,
  turn: number,
  uvSign: Choices['uvSign'],
): string[] {
  const { coordinates, precession, sidereal, largest, sign } = comparison;
  const warnings: string[] = [];
  const percent = (part: number) => `${(100 * part).toPrecision(2)} %`;
  if (!fits) {
    warnings.push(
      `u and v agree with the station positions with neither sign (${percent(largest)} of the longest baseline): their sign is not confirmed.`,
    );
    return warnings;
  }
  if (sign !== turn) {
    warnings.push(
      `uvSign is ${uvSign}, but computed from the station positions u and v have the other sign: the picture is turned by 180°.`,
    );
  }
  if (largest > GOOD_AGREEMENT) {
    warnings.push(
      `u and v agree with the station positions only to ${percent(largest)} of the longest baseline.`,
    );
  }
  if (sidereal === 'computed' && comparison.fileHasSidereal) {
    warnings.push(
      'u and v agree with the mean sidereal time of Greenwich, not with GSTIA0 and RDATE of the antenna table.',
    );
  }
  if (comparison.statedJ2000 && coordinates === 'as they stand' && precession > GOOD_AGREEMENT) {
    warnings.push(
      `The coordinates are stated as J2000 but used as if of date: u and v are off by up to ${percent(precession)}. Not corrected.`,
    );
  }
  return warnings;
}

function findingOf(comparison: Comparison | undefined, fits: boolean): string {
  if (comparison === undefined) return 'not checked: no station positions';
  const { sign, coordinates, sidereal, mirrored: mirror } = comparison;
  if (!fits) return 'agree with the station positions with neither sign';
  return [
    sign > 0 ? 'the sign is that of the format' : 'the sign is opposite to that of the format',
    `coordinates ${coordinates}`,
    `sidereal time ${sidereal}`,
    ...(mirror ? ['station positions mirrored'] : []),
  ].join('; ');
}

/** Refuses (u,v) that no baseline on Earth can have, and says why they may be what they are.
 *  @param longestWavelengths  |(u,v)| of the longest baseline
 *  @param stored   its value before the multiplication by frequency, in seconds; undefined where that is not done
 *  @throws InputProblem */
export function requirePlausible(
  longestWavelengths: number,
  stored: number | undefined,
  place: string,
): void {
  if (longestWavelengths > LEAST_WAVELENGTHS && longestWavelengths < MOST_WAVELENGTHS) return;
  throw new InputProblem({
    code: 'implausible-uv',
    place,
    expected: `${LEAST_WAVELENGTHS.toExponential()} to ${MOST_WAVELENGTHS.toExponential()} wavelengths on the longest baseline`,
    found: `${longestWavelengths.toExponential(3)} wavelengths${stored === undefined ? '' : ` (${stored.toExponential(3)} s)`}`,
    advice: likelyCause(longestWavelengths, stored),
  });
}

function likelyCause(longest: number, stored: number | undefined): string {
  if (!(longest > 0)) return 'All u and v are 0: they were never computed. Write the file with u and v.';
  if (stored === undefined) return 'Check the unit of u and v and the frequency.';
  if (stored > LEAST_WAVELENGTHS && stored < MOST_WAVELENGTHS) {
    return 'Likely cause: u and v lie in the file in wavelengths (or metres) while PSCAL is 1; with wavelengths PSCAL must be 1/frequency. Correct PSCAL or u and v.';
  }
  if (longest < LEAST_WAVELENGTHS) {
    return 'Likely cause: u and v lie in the file in seconds and are scaled by PSCAL = 1/frequency once more; PSCAL must then be 1. Correct PSCAL, or the frequency (CRVAL of FREQ) if it is not in Hz.';
  }
  return 'Likely cause: u and v are not in seconds after PSCAL and PZERO, or the frequency (CRVAL of FREQ) is not in Hz. Correct the header.';
}
