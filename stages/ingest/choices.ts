/** The parameters of `ingest` as the runner resolved them, typed. */

export interface ColumnChoice {
  readonly column: string;
  readonly unit: string | undefined;
}

export interface TableChoice {
  readonly target: string;
  readonly ra: number;
  readonly dec: number;
  readonly frequency: number;
  readonly bandwidth: number;
  readonly array: string;
  readonly remark: string;
  readonly stations: Readonly<Record<string, readonly number[]>>;
}

export interface Choices {
  readonly polarisation: 'stokes-i' | 'I' | 'RR' | 'LL' | 'XX' | 'YY';
  readonly bands?: readonly number[];
  readonly channels?: readonly number[];
  readonly target?: string;
  readonly leaveOut: readonly string[];
  readonly fromHours?: number;
  readonly toHours?: number;
  readonly fromMjd?: number;
  readonly toMjd?: number;
  readonly gap: number;
  readonly averaging: 'scan' | 'none' | number;
  readonly completeness: number;
  readonly leastSnr?: number;
  readonly uvSign: 'check' | 'as-written' | 'reversed';
  readonly rules?: 'enforce' | 'ignore';
  readonly checksums: 'verify' | 'ignore';
  readonly columns?: Readonly<Record<string, string | { readonly column: string; readonly unit?: string }>>;
  readonly timeOrigin: number;
  readonly table?: TableChoice;
}

/** The runner has checked types and ranges against the declaration; nothing is checked again. */
export function choicesOf(parameters: Readonly<Record<string, unknown>>): Choices {
  return parameters as unknown as Choices;
}
