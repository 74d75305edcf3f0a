/** Posterior samples: a `fits-table` with EXTNAME SAMPLES. Layout: CONVENTIONS. */

import type { ByteSink, ByteSource } from '../bytes.ts';
import type { Posterior } from '../data.ts';
import { requireFiniteColumn, requireFiniteValues, requireRepeat } from './column-rules.ts';
import { openFits, requireTable } from './fits/hdu.ts';
import { requireInteger } from './fits/header.ts';
import { appendEmptyPrimary, appendTableHdu, readTable } from './fits/table.ts';

const mostComponents = 1_000_000;

/** Reads the draws. @throws InputProblem when the table is not of that layout or a value is not finite. */
export function readPosterior(source: ByteSource): Posterior {
  const table = readTable(source, requireTable(source, openFits(source), 'SAMPLES'));
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

/** Writes the draws. @throws InternalError when the arrays have other lengths than they must or a value is not finite. */
export function writePosterior(sink: ByteSink, posterior: Posterior): void {
  requireFiniteValues(posterior.flux, 'writePosterior, flux');
  requireFiniteValues(posterior.coefficients, 'writePosterior, coefficients');
  appendEmptyPrimary(sink);
  appendTableHdu(sink, {
    extname: 'SAMPLES',
    rows: posterior.count,
    columns: [
      { name: 'FLUX', form: '1D', unit: 'Jy', values: posterior.flux },
      { name: 'COEFFICIENT', form: `${posterior.components}D`, unit: 'Jy', values: posterior.coefficients },
    ],
    cards: [['NCOMP', posterior.components, 'components']],
  });
}
