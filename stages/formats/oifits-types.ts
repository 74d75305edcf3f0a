/** The tables of an OIFITS file as objects. Words of the standard: INSNAME names a table of wavelengths, ARRNAME a table
 *  of stations. Source: Duvert, Young & Hummel 2017, A&A 597, A8 (revision 2); Pauls et al. 2005, PASP 117, 1255
 *  (revision 1). Column lists other than those of OI_VIS and OI_T3 are from memory of the standard. */

import type { Header } from './fits/header.ts';
import type { Table } from './fits/table.ts';

export interface Oifits {
  /** 2 when the primary header says CONTENT = OIFITS2, else 1. */
  readonly revision: 1 | 2;
  readonly primary: Header;
  readonly targets: readonly OiTarget[];
  readonly arrays: readonly OiArray[];
  readonly wavelengths: readonly OiWavelength[];
  readonly vis: readonly OiVis[];
  readonly vis2: readonly OiVis2[];
  readonly t3: readonly OiT3[];
  readonly flux: readonly OiFlux[];
  /** EXTNAMEs of tables that are not read, such as OI_CORR and OI_INSPOL. */
  readonly others: readonly string[];
}

export interface OiTarget {
  /** TARGET_ID */
  readonly id: number;
  readonly name: string;
  readonly raDegrees: number;
  readonly decDegrees: number;
  /** Years. */
  readonly equinox: number;
}

export interface OiStation {
  /** STA_INDEX */
  readonly index: number;
  readonly name: string;
  readonly telescope: string;
  /** Metres: ARRAYX, Y, Z and STAXYZ added when the frame is GEOCENTRIC, else STAXYZ. */
  readonly xyz: readonly [number, number, number];
  readonly diameterMetres: number;
}

export interface OiArray {
  /** ARRNAME */
  readonly name: string;
  /** FRAME, such as GEOCENTRIC or SKY. */
  readonly frame: string;
  readonly stations: readonly OiStation[];
}

export interface OiWavelength {
  /** INSNAME */
  readonly name: string;
  /** Metres; from the column NS_WAVE in double precision where there is one, else EFF_WAVE. */
  readonly wavelengths: Float64Array;
  readonly bandwidths: Float64Array;
}

/** What all tables of data share. Row r, channel c of a data column is [r * channels + c]. */
export interface OiData {
  readonly place: string;
  /** OI_REVN */
  readonly revision: number;
  readonly dateObs: string;
  /** Undefined when the table names none, as revision 1 allows. */
  readonly array: OiArray | undefined;
  readonly wavelength: OiWavelength;
  readonly rows: number;
  readonly channels: number;
  /** Index into `targets`. */
  readonly target: Int32Array;
  /** NaN where it is not given. */
  readonly mjd: Float64Array;
  readonly integrationSeconds: Float64Array;
  /** 0 use, 1 do not use, 2 undefined; undefined counts as do not use. */
  readonly flag: Uint8Array;
  /** Index into `array.stations`, -1 without array; `stationsPerRow` in a row, 0 when the table has no STA_INDEX. */
  readonly stations: Int32Array;
  readonly stationsPerRow: number;
  /** All columns, those that the standard does not know (NS_...) included. */
  readonly table: Table;
}

export interface OiVis extends OiData {
  /** AMPTYP and PHITYP in lower case; `absolute` where the table does not say. */
  readonly amplitudeType: string;
  readonly phaseType: string;
  /** Unit of `amplitude` and `amplitudeError`; empty for normalised visibilities. */
  readonly unit: string;
  readonly amplitude: Float64Array;
  readonly amplitudeError: Float64Array;
  readonly phaseDegrees: Float64Array;
  readonly phaseErrorDegrees: Float64Array;
  /** Metres. */
  readonly u: Float64Array;
  readonly v: Float64Array;
}

export interface OiVis2 extends OiData {
  readonly squared: Float64Array;
  readonly squaredError: Float64Array;
  readonly u: Float64Array;
  readonly v: Float64Array;
}

export interface OiT3 extends OiData {
  readonly amplitude: Float64Array;
  readonly amplitudeError: Float64Array;
  readonly phaseDegrees: Float64Array;
  readonly phaseErrorDegrees: Float64Array;
  /** Metres, stations 1 to 2 and 2 to 3; the third baseline is minus their sum. */
  readonly u1: Float64Array;
  readonly v1: Float64Array;
  readonly u2: Float64Array;
  readonly v2: Float64Array;
}

export interface OiFlux extends OiData {
  /** CALSTAT = C. */
  readonly calibrated: boolean;
  readonly unit: string;
  readonly flux: Float64Array;
  readonly fluxError: Float64Array;
}
