/** uv data as FITS random groups (format `uv-fits`): what a file holds in memory. Reading: uv-groups-read.ts, writing:
 *  uv-groups-write.ts. Source: FITS Standard 4.0, section 6, for the container; the names and meanings of parameters,
 *  axes, antenna table and frequency table are common practice.
 *
 *  Each group is one row: parameters u, v, w (seconds), BASELINE, DATE (given twice, to be added), and one complex
 *  number with its weight for every Stokes parameter (or hand), channel and band. A baseline i–j has
 *  (u, v) = (r_i − r_j) · (east, north) / c and V = Σ I exp(+2πi ν (ux + vy)): the opposite of CONVENTIONS. */

import type { AntennaTable } from './uv-antennas.ts';

export type { AntennaTable, UvAntenna } from './uv-antennas.ts';
export { decodeBaseline } from './uv-baselines.ts';
export { readUvGroups } from './uv-groups-read.ts';
export { type UvStation, type UvWriteRequest, writeUvGroups } from './uv-groups-write.ts';

export interface UvData {
  readonly target: { readonly name: string; readonly raDegrees: number; readonly decDegrees: number };
  /** Of the coordinates, as the header states it; undefined when it does not. */
  readonly equinox: number | undefined;
  readonly arrayName: string;
  /** The text of keyword REMARK, which our own writer uses; empty otherwise. */
  readonly remark: string;
  /** Value of the FREQ axis at its reference pixel. */
  readonly referenceFrequencyHz: number;
  readonly bandCount: number;
  readonly channelCount: number;
  /** frequency[band * channelCount + channel], Hz. */
  readonly frequencyHz: Float64Array;
  /** Width of a channel of each band, Hz. */
  readonly widthHz: Float64Array;
  /** Codes along the STOKES axis: 1 to 4 I Q U V, −1 to −4 RR LL RL LR, −5 to −8 XX YY XY YX. */
  readonly stokes: readonly number[];
  readonly antennas: readonly AntennaTable[];
  /** Rows. */
  readonly count: number;
  readonly hasIntegration: boolean;
  /** Rows from `from` on, at most `rows` of them. */
  readonly block: (from: number, rows: number) => UvBlock;
}

/** Some rows. Arrays run over the rows of the block. */
export interface UvBlock {
  readonly from: number;
  readonly count: number;
  /** Seconds. */
  readonly u: Float64Array;
  readonly v: Float64Array;
  readonly w: Float64Array;
  /** UTC: the lead that the antenna table states is taken off. */
  readonly timeMjd: Float64Array;
  /** Station numbers of the antenna table. */
  readonly number1: Int32Array;
  readonly number2: Int32Array;
  /** From 1. */
  readonly subarray: Int32Array;
  /** 0 when the file does not say. */
  readonly integrationSeconds: Float64Array;
  /** 0 when the file does not say. */
  readonly source: Int32Array;
  readonly frequencySetup: Int32Array;
  /** Real, imaginary, weight of a sample at data[row * rowStride + sampleOffset(stokes, band, channel) + 0, 1, 2 * partStride]. */
  readonly data: Float64Array;
  readonly rowStride: number;
  readonly partStride: number;
  readonly sampleOffset: (stokes: number, band: number, channel: number) => number;
}

/** Names of the codes on the STOKES axis. FITS Standard 4.0, section 8.6, conventional Stokes values. */
export const STOKES_NAMES: ReadonlyMap<number, string> = new Map([
  [1, 'I'],
  [2, 'Q'],
  [3, 'U'],
  [4, 'V'],
  [-1, 'RR'],
  [-2, 'LL'],
  [-3, 'RL'],
  [-4, 'LR'],
  [-5, 'XX'],
  [-6, 'YY'],
  [-7, 'XY'],
  [-8, 'YX'],
]);
