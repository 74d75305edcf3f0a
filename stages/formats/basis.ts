/** The format `basis`: a cube of the mean and the components, their eigenvalues, and the scores of the library.
 *  Layout: CONVENTIONS. */

import type { ByteSink, ByteSource } from '../bytes.ts';
import type { Basis } from '../data.ts';
import { InputProblem } from '../problem.ts';
import { fromArcsec, toArcsec } from './angles.ts';
import { requireFiniteColumn, requireFiniteValues, requireRepeat } from './column-rules.ts';
import { type Hdu, openFits, requireTable } from './fits/hdu.ts';
import { requireNumber } from './fits/header.ts';
import { startImageHdu } from './fits/image.ts';
import { appendTableHdu, readTable } from './fits/table.ts';
import { gridCards, skyCubeOf } from './sky-image.ts';

const leastFamilyWidth = 24;

/** Reads a basis. @throws InputProblem when tables and cube do not belong together or a value is not finite. */
export function readBasis(source: ByteSource): Basis {
  const hdus = openFits(source);
  const cube = skyCubeOf(source, hdus[0] as Hdu);
  const header = (hdus[0] as Hdu).header;
  const spectrum = readTable(source, requireTable(source, hdus, 'SPECTRUM'));
  const scores = readTable(source, requireTable(source, hdus, 'SCORES'));
  const count = cube.count - 1;
  if (!(count >= 1 && spectrum.rows === count)) {
    throw new InputProblem({
      code: 'wrong-shape',
      place: spectrum.place,
      expected: `one eigenvalue per component, and at least one component (the cube has ${cube.count} planes)`,
      found: `${spectrum.rows} rows`,
      advice: 'Give the output of a stage of kind basis-build.',
    });
  }
  const scoreColumn = scores.column('SCORE');
  requireRepeat(scoreColumn, count, scores.place);
  return {
    nx: cube.nx,
    ny: cube.ny,
    pixelRadians: cube.pixelRadians,
    resolutionRadians: fromArcsec(requireNumber(header, 'RESOLUTN')),
    mean: cube.plane(0),
    components: Array.from({ length: count }, (_, k) => cube.plane(k + 1)),
    eigenvalues: requireFiniteColumn(spectrum.column('EIGENVALUE'), spectrum.place),
    totalVariance: requireNumber(spectrum.header, 'TOTVAR'),
    scores: requireFiniteColumn(scoreColumn, scores.place),
    families: scores.column('FAMILY').texts(),
  };
}

/** Writes a basis. @throws InternalError when its arrays do not belong together or hold a value that is not finite. */
export function writeBasis(sink: ByteSink, basis: Basis): void {
  const { nx, ny, components, families } = basis;
  const count = components.length;
  requireFiniteValues(basis.scores, 'writeBasis, scores');
  requireFiniteValues(basis.eigenvalues, 'writeBasis, eigenvalues');
  const image = startImageHdu(sink, {
    shape: [nx, ny, count + 1],
    bitpix: -64,
    first: true,
    cards: [
      ...gridCards(nx, ny, basis.pixelRadians),
      ['CTYPE3', 'COMPONENT', 'plane 1 is the mean'],
      ['RESOLUTN', toArcsec(basis.resolutionRadians), 'arcsec, FWHM of the band limit, 0 for none'],
    ],
  });
  for (const plane of [basis.mean, ...components]) {
    requireFiniteValues(plane, 'writeBasis, planes');
    image.write(plane);
  }
  image.end();
  appendTableHdu(sink, {
    extname: 'SPECTRUM',
    rows: count,
    columns: [{ name: 'EIGENVALUE', form: '1D', values: basis.eigenvalues }],
    cards: [['TOTVAR', basis.totalVariance, 'total variance of the library']],
  });
  const width = Math.max(leastFamilyWidth, ...families.map((name) => name.length));
  appendTableHdu(sink, {
    extname: 'SCORES',
    rows: families.length,
    columns: [
      { name: 'FAMILY', form: `${width}A`, values: families },
      { name: 'SCORE', form: `${count}D`, values: basis.scores },
    ],
  });
}
