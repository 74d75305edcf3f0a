/** Posterior samples: a `fits-table` with EXTNAME SAMPLES. Layout: CONVENTIONS. */

import type { ByteSink, ByteSource } from '../bytes.ts';
import type { Posterior } from '../data.ts';
import { InputProblem } from '../problem.ts';
import { requireFiniteColumn, requireFiniteValues, requireRepeat } from './column-rules.ts';
import { openFits, requireTable } from './fits/hdu.ts';
import { requireInteger, requireText } from './fits/header.ts';
import { appendEmptyPrimary, appendTableHdu, type NewColumn, readTable, type Table } from './fits/table.ts';

const mostComponents = 1_000_000;

/** Reads the draws. @throws InputProblem when the table is not of that layout or a value is not finite. */
export function readPosterior(source: ByteSource): Posterior {
  return posteriorOf(readTable(source, requireTable(source, openFits(source), 'SAMPLES')));
}

function posteriorOf(table: Table): Posterior {
  const components = requireInteger(table.header, 'NCOMP', 0, mostComponents);
  const coefficients = table.column('COEFFICIENT');
  requireRepeat(coefficients, components, table.place);
  return {
    count: table.rows,
    components,
    flux: requireFiniteColumn(table.column('FLUX'), table.place),
    coefficients: requireFiniteColumn(coefficients, table.place),
  };
}

const ROLES = ['gains fixed', 'components'] as const;

/** Other posteriors beside the main one, and what each is. */
export interface PosteriorVariant {
  /** `gains fixed`: with the gains held at the optimum. `components`: with another number of components. */
  readonly role: (typeof ROLES)[number];
  readonly posterior: Posterior;
}

/** Reads the variants: tables VARIANT. @throws InputProblem as `readPosterior`, and for a ROLE that is none */
export function readVariants(source: ByteSource): PosteriorVariant[] {
  return openFits(source)
    .filter((hdu) => hdu.kind === 'table' && hdu.extname === 'VARIANT')
    .map((hdu) => {
      const table = readTable(source, hdu);
      return { role: roleOf(table), posterior: posteriorOf(table) };
    });
}

function roleOf({ header, place }: Table): PosteriorVariant['role'] {
  const role = requireText(header, 'ROLE');
  const known = ROLES.find((each) => each === role);
  if (known !== undefined) return known;
  throw new InputProblem({
    code: 'bad-value',
    place,
    expected: `ROLE ${ROLES.join(' or ')}`,
    found: JSON.stringify(role),
    advice: 'Give the output of a stage of kind fit.',
  });
}

/** Writes the draws. @throws InternalError when the arrays have other lengths than they must or a value is not finite. */
export function writePosterior(
  sink: ByteSink,
  posterior: Posterior,
  { chain, variants = [] }: { chain?: Int32Array; variants?: readonly PosteriorVariant[] } = {},
): void {
  appendEmptyPrimary(sink);
  appendDraws(sink, 'SAMPLES', posterior, [], chain);
  for (const { role, posterior: draws } of variants) appendDraws(sink, 'VARIANT', draws, [['ROLE', role]]);
}

function appendDraws(
  sink: ByteSink,
  extname: string,
  posterior: Posterior,
  cards: readonly (readonly [string, string])[],
  chain?: Int32Array,
): void {
  requireFiniteValues(posterior.flux, 'writePosterior, flux');
  requireFiniteValues(posterior.coefficients, 'writePosterior, coefficients');
  const ofChain: NewColumn[] = chain === undefined ? [] : [{ name: 'CHAIN', form: '1J', values: [...chain] }];
  appendTableHdu(sink, {
    extname,
    rows: posterior.count,
    columns: [
      { name: 'FLUX', form: '1D', unit: 'Jy', values: posterior.flux },
      { name: 'COEFFICIENT', form: `${posterior.components}D`, unit: 'Jy', values: posterior.coefficients },
      ...ofChain,
    ],
    cards: [['NCOMP', posterior.components, 'components'], ...cards],
  });
}
