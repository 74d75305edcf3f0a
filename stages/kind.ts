/** What a stage kind is: a constant object that declares inputs, parameters and outputs, and loads its computation.
 *
 *  A stage is a function from inputs and parameters to outputs. It knows no path, no recipe and no book: inputs are
 *  read through ByteSource, outputs written through ByteSink. The declaration (KIND/KIND.ts) is light, because the
 *  command line reads every one of them at every start; the computation (KIND/compute.ts) is loaded on demand, in the
 *  stage's own process. */

import type { ByteSink, ByteSource } from './bytes.ts';

/** Formats of what goes between stages; see CONVENTIONS.md for the layout of each. `uv-fits`, `oifits` and `csv` come
 *  from outside, `file` is unspecified bytes. */
export type Format =
  | 'uv-fits'
  | 'oifits'
  | 'csv'
  | 'visibilities'
  | 'fits-image'
  | 'fits-cube'
  | 'fits-table'
  | 'basis'
  | 'numbers'
  | 'json'
  | 'svg'
  | 'file';

export interface InputDeclaration {
  /** What may come in; a stage's output must be of one of these formats, a file's content is checked by the stage. */
  readonly format: Format | readonly Format[];
  readonly doc: string;
  readonly optional?: true;
  /** The recipe may give a list of references; the stage then finds them in `inputs.NAME` in that order. */
  readonly many?: true;
}

interface ParameterBase {
  readonly doc: string;
  /** Why that default. */
  readonly why?: string;
  /** May be left out, and is then absent from the parameters. */
  readonly optional?: true;
}

/** Declared types of parameters. A quantity is written `160 uas` in a recipe and reaches the stage as a number in
 *  the declared unit; `from` and `to` are inclusive, in that unit, and NaN never passes them. */
export type ParameterDeclaration =
  | (ParameterBase & {
      readonly type: 'integer' | 'number';
      readonly from?: number;
      readonly to?: number;
      readonly default?: number;
    })
  | (ParameterBase & {
      readonly type: 'quantity';
      readonly unit: string;
      readonly from?: number;
      readonly to?: number;
      readonly default?: string;
    })
  | (ParameterBase & { readonly type: 'boolean'; readonly default?: boolean })
  | (ParameterBase & { readonly type: 'word'; readonly words: readonly string[]; readonly default?: string })
  | (ParameterBase & { readonly type: 'text'; readonly pattern?: string; readonly default?: string })
  | (ParameterBase & {
      readonly type: 'list';
      readonly of: ParameterDeclaration;
      readonly least?: number;
      readonly most?: number;
      readonly default?: readonly unknown[];
    })
  /** Fields with fixed names. Fields' defaults are filled in one by one. */
  | (ParameterBase & {
      readonly type: 'group';
      readonly fields: Readonly<Record<string, ParameterDeclaration>>;
      readonly default?: Readonly<Record<string, unknown>>;
    })
  /** Free names (stations, columns), each with a value of one type. */
  | (ParameterBase & {
      readonly type: 'map';
      readonly of: ParameterDeclaration;
      readonly default?: Readonly<Record<string, unknown>>;
    })
  /** The first alternative that admits the value holds, such as an integer or a word. */
  | (ParameterBase & {
      readonly type: 'either';
      readonly of: readonly ParameterDeclaration[];
      readonly default?: unknown;
    });

export interface OutputDeclaration {
  readonly format: Format;
  readonly doc: string;
  /** Of an output of format `numbers`: every name that it can hold, so that a recipe which publishes another is refused
   *  before anything runs. Undefined where the names are not known beforehand. */
  readonly numbers?: readonly string[];
  /** Names of optional inputs without which this output is not made. */
  readonly needs?: readonly string[];
  /** Name of an optional parameter, a list of words: when it is given, this output is made only if its name is in it. */
  readonly chosenBy?: string;
}

/** One test of the data with its limits, as the entry, the terminal and the figures show it. */
export interface Finding {
  readonly check: string;
  readonly finding: 'within limits' | 'marginal' | 'out of limits';
  readonly value: number;
  readonly marginal: number;
  readonly limit: number;
  /** What was measured on how much, with the worst station or baseline, in one sentence. */
  readonly detail: string;
}

/** What a stage says besides its outputs. `stop` ends the run after this stage, with its reason; `mark` is set on
 *  every plate that depends on this stage. */
export interface StageReport {
  readonly findings?: readonly Finding[];
  readonly warnings?: readonly string[];
  readonly stop?: string;
  readonly mark?: string;
}

/** What a computation is handed. */
export interface StageTask {
  /** One source per reference, in the order of the recipe; absent when an optional input was not given. */
  readonly inputs: Readonly<Record<string, readonly ByteSource[]>>;
  /** Resolved parameters: defaults filled in, quantities as numbers in the declared unit. */
  readonly parameters: Readonly<Record<string, unknown>>;
  /** One sink per declared output whose `needs` are met and that is chosen. Every one of them must be written. */
  readonly outputs: Readonly<Record<string, ByteSink>>;
  /** Writes a line to the stage's log. */
  readonly note: (message: string, fields?: Readonly<Record<string, unknown>>) => void;
  /** Says how far the work is, 0 to 1. */
  readonly progress: (fraction: number) => void;
}

export type Compute = (task: StageTask) => StageReport | Promise<StageReport>;

export interface StageKind {
  readonly kind: string;
  /** Changes whenever the output bytes can change. */
  readonly version: number;
  readonly doc: string;
  /** Where the method comes from. */
  readonly source: string;
  readonly inputs: Readonly<Record<string, InputDeclaration>>;
  readonly parameters: Readonly<Record<string, ParameterDeclaration>>;
  readonly outputs: Readonly<Record<string, OutputDeclaration>>;
  readonly load: () => Promise<{ readonly compute: Compute }>;
}
