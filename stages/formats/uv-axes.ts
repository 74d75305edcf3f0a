/** Axes of uv data and what they say: frequencies, position. Axes are found by CTYPE, wherever they stand. Common
 *  practice; coordinates along an axis: FITS Standard 4.0, eq. 9. */

import type { GroupsData } from './fits/groups.ts';
import type { Hdu } from './fits/hdu.ts';
import { type FrequencySetup, numberOf } from './uv-antennas.ts';
import { uvProblem } from './uv-problem.ts';

export interface Axis {
  readonly n: number;
  readonly crval: number;
  readonly crpix: number;
  readonly cdelt: number;
  readonly stride: number;
}

export interface Axes {
  readonly part: Axis;
  readonly stokes: Axis;
  readonly channel: Axis;
  readonly band: Axis;
  readonly ra: Axis | undefined;
  readonly dec: Axis | undefined;
}

export function valueAt(axis: Axis, pixel: number): number {
  return axis.crval + (pixel - axis.crpix) * axis.cdelt;
}

/** Axes by CTYPE, wherever they stand. Missing STOKES means total intensity, missing IF one band. */
export function findAxes(hdu: Hdu, groups: GroupsData): Axes {
  const found = new Map<string, Axis>();
  let stride = 1;
  for (const axis of groups.axes) {
    const name = axis.ctype.trim().toUpperCase();
    const key = ['COMPLEX', 'STOKES', 'FREQ', 'IF', 'RA', 'DEC'].find((each) =>
      each === 'IF' || each === 'COMPLEX' || each === 'STOKES' ? name === each : name.split('-')[0] === each,
    );
    if (key === undefined && axis.n > 1) {
      throw uvProblem(
        'unknown-axis',
        hdu.place,
        'the axes COMPLEX, STOKES, FREQ, IF, RA, DEC',
        `an axis ${name || 'without name'} of length ${axis.n}`,
      );
    }
    if (key !== undefined && found.has(key)) {
      throw uvProblem('doubled-axis', hdu.place, `one axis ${key}`, 'two');
    }
    if (key !== undefined) found.set(key, { ...axis, stride });
    stride *= axis.n;
  }
  const part = found.get('COMPLEX');
  const channel = found.get('FREQ');
  if (part === undefined || part.n !== 3) {
    throw uvProblem(
      'no-complex-axis',
      hdu.place,
      'an axis COMPLEX of length 3 (real, imaginary, weight)',
      part ? `length ${part.n}` : 'none',
    );
  }
  if (channel === undefined || !(channel.crval > 0)) {
    throw uvProblem(
      'no-frequency',
      hdu.place,
      'an axis FREQ with a frequency above 0',
      channel ? `${channel.crval} Hz` : 'none',
    );
  }
  const stokes = found.get('STOKES');
  if (stokes !== undefined) requireCodes(hdu, stokes);
  const single = (crval: number): Axis => ({ n: 1, crval, crpix: 1, cdelt: 1, stride: 0 });
  return {
    part,
    channel,
    stokes: stokes ?? single(1),
    band: found.get('IF') ?? single(1),
    ra: found.get('RA'),
    dec: found.get('DEC'),
  };
}

/** Codes of the products are whole and unlike: otherwise two products would go by one name. */
function requireCodes(hdu: Hdu, axis: Axis): void {
  const codes = [valueAt(axis, 1), valueAt(axis, axis.n)];
  if (codes.every(Number.isInteger) && Number.isInteger(axis.cdelt) && (axis.n === 1 || axis.cdelt !== 0))
    return;
  throw uvProblem(
    'bad-stokes',
    hdu.place,
    'whole numbers, each once, on the axis STOKES',
    `codes from ${codes[0]} to ${codes[1]} in steps of CDELT ${axis.cdelt}`,
  );
}

export function coordinate(hdu: Hdu, axis: Axis | undefined, keyword: string): number {
  const value = axis === undefined || axis.n !== 1 ? numberOf(hdu.header, keyword) : axis.crval;
  if (value !== undefined && Math.abs(value) <= 360) return value;
  throw uvProblem(
    'no-position',
    hdu.place,
    `the target's position on the axes RA and DEC, degrees`,
    `${value ?? 'none'}`,
  );
}

/** Frequency of every channel of every band, and the width of a channel of each band, Hz. @throws InputProblem */
export function frequencies(hdu: Hdu, channel: Axis, bands: number, setup: FrequencySetup | undefined) {
  if (setup === undefined ? bands > 1 : setup.offsetHz.length !== bands) {
    const found =
      setup === undefined ? 'no frequency table (FQ)' : `a frequency table for ${setup.offsetHz.length}`;
    throw uvProblem('bad-frequency-table', hdu.place, `the frequencies of ${bands} bands`, found);
  }
  const frequencyHz = new Float64Array(bands * channel.n);
  const widthHz = new Float64Array(bands);
  for (let band = 0; band < bands; band++) {
    const stated = setup?.channelHz[band] ?? 0;
    const step = stated || channel.cdelt;
    if (channel.n > 1 && step === 0) {
      throw uvProblem('no-frequency', hdu.place, `a step of frequency along ${channel.n} channels`, '0 Hz');
    }
    const total = setup?.totalHz[band] ?? 0;
    widthHz[band] = channel.n === 1 && total > 0 && Number.isFinite(total) ? total : Math.abs(step);
    for (let c = 0; c < channel.n; c++) {
      const frequency = channel.crval + (setup?.offsetHz[band] ?? 0) + (c + 1 - channel.crpix) * step;
      if (!(frequency > 0 && Number.isFinite(frequency))) {
        throw uvProblem(
          'no-frequency',
          hdu.place,
          `a frequency above 0 for channel ${c + 1} of band ${band + 1}`,
          `${frequency} Hz`,
        );
      }
      frequencyHz[band * channel.n + c] = frequency;
    }
  }
  return { frequencyHz, widthHz };
}
