/** The format `visibilities`: OIFITS 2 with one wavelength and one OI_VIS of correlated flux, which optical data leave empty,
 *  beside it OI_VIS2 and OI_T3 at most once. Layout: CONVENTIONS.
 *  Three columns are ours: NS_SCAN, and NS_WAVE and NS_BAND, since EFF_WAVE and EFF_BAND hold single precision.
 *  DATE, which OIFITS demands, is the date of observation: no output may depend on the clock. */

import type { ByteSource } from '../bytes.ts';
import type { Visibilities } from '../data.ts';
import { cos, sin } from '../numerics/elementary.ts';
import { InputProblem } from '../problem.ts';
import { fromDegrees } from './angles.ts';
import { requireFiniteColumn } from './column-rules.ts';
import { requireText } from './fits/header.ts';
import { readOifits } from './oifits.ts';
import type { OiArray, Oifits, OiVis } from './oifits-types.ts';
import { isScanNumber, readSquared, readTriples } from './visibilities-optical.ts';

/** Reads visibilities.
 *  @throws InputProblem when the file is other OIFITS, or a row is flagged, not finite or without a positive sigma */
export function readVisibilities(source: ByteSource): Visibilities {
  const oifits = readOifits(source);
  const vis = requireLayout(oifits, source.name);
  const { table, rows: count } = vis;
  const wavelengthMetres = vis.wavelength.wavelengths[0] as number;
  const column = (name: string) => requireFiniteColumn(table.column(name), table.place);
  const amplitude = column('VISAMP');
  const phase = column('VISPHI').map(fromDegrees);
  const sigma = column('VISAMPERR');
  const scan = column('NS_SCAN');
  const target = oifits.targets[0] as Oifits['targets'][number];
  const array = vis.array as OiArray;
  requireFinite(oifits, vis);
  requireRows(vis, sigma, scan);
  return {
    target: { name: target.name, raDegrees: target.raDegrees, decDegrees: target.decDegrees },
    arrayName: array.name,
    remark: requireText(oifits.primary, 'REMARK', ''),
    stations: array.stations.map(({ name, xyz }) => ({ name, xyz })),
    wavelengthMetres,
    bandwidthMetres: vis.wavelength.bandwidths[0] as number,
    count,
    station1: vis.stations.filter((_, i) => i % 2 === 0),
    station2: vis.stations.filter((_, i) => i % 2 === 1),
    scan: Int32Array.from(scan),
    timeMjd: column('MJD'),
    integrationSeconds: column('INT_TIME'),
    u: column('UCOORD').map((u) => u / wavelengthMetres),
    v: column('VCOORD').map((v) => v / wavelengthMetres),
    re: amplitude.map((a, k) => a * cos(phase[k] as number)),
    im: amplitude.map((a, k) => a * sin(phase[k] as number)),
    sigma,
    sigmaPhase: column('VISPHIERR').map(fromDegrees),
    ...opticalOf(oifits, wavelengthMetres),
  };
}

function opticalOf(
  { vis2, t3 }: Oifits,
  wavelengthMetres: number,
): Pick<Visibilities, 'squared' | 'triples'> {
  return {
    ...(vis2.length > 0 ? { squared: readSquared(vis2[0], wavelengthMetres) } : {}),
    ...(t3.length > 0 ? { triples: readTriples(t3[0], wavelengthMetres) } : {}),
  };
}

function requireLayout({ targets, wavelengths, vis, vis2, t3, flux }: Oifits, place: string): OiVis {
  const [only] = vis;
  const single = targets.length === 1 && wavelengths.length === 1 && vis.length === 1;
  const few = vis2.length <= 1 && t3.length <= 1 && flux.length === 0;
  const correlated = only?.amplitudeType === 'correlated flux' && only.unit === 'Jy';
  const complete = [...vis, ...vis2, ...t3].every(
    ({ array, channels, table }) => array !== undefined && channels === 1 && table.has('NS_SCAN'),
  );
  if (only !== undefined && single && few && correlated && complete) return only;
  throw new InputProblem({
    code: 'wrong-layout',
    place,
    expected:
      'one OI_VIS of correlated flux in Jy, one OI_VIS2 and one OI_T3 at most, with one target, one wavelength and a column NS_SCAN',
    found:
      `${vis.length} OI_VIS (${only?.amplitudeType ?? 'none'}, unit "${only?.unit ?? ''}"), ` +
      `${targets.length} targets, ${wavelengths.length} OI_WAVELENGTH, ` +
      `${vis2.length} OI_VIS2, ${t3.length} OI_T3, ${flux.length} OI_FLUX`,
    advice: 'Other OIFITS goes through a stage of kind ingest first.',
  });
}

/** @throws InputProblem for a position or a band that is not finite */
function requireFinite({ targets: [target] }: Oifits, { array, wavelength, place }: OiVis): void {
  const facts: [string, number[]][] = [
    ['RAEP0 and DECEP0', [target.raDegrees, target.decDegrees]],
    ['EFF_BAND', [wavelength.bandwidths[0]]],
    ...((array as OiArray).stations.map(({ name, xyz }) => [`STAXYZ of ${name}`, [...xyz]]) as [
      string,
      number[],
    ][]),
  ];
  for (const [what, values] of facts) {
    if (values.every(Number.isFinite)) continue;
    throw new InputProblem({
      code: 'not-finite',
      place,
      expected: `${what} finite`,
      found: values.join(', '),
      advice: 'Give the output of a stage, or take the file through a stage of kind ingest.',
    });
  }
}

function requireRows(vis: OiVis, sigma: Float64Array, scan: Float64Array): void {
  for (let row = 0; row < vis.rows; row++) {
    const inOrder = (vis.stations[2 * row] as number) < (vis.stations[2 * row + 1] as number);
    const s = scan[row] as number;
    const found =
      vis.flag[row] !== 0
        ? 'FLAG set'
        : !((sigma[row] as number) > 0)
          ? `VISAMPERR ${sigma[row]}`
          : !inOrder
            ? 'stations against the order of OI_ARRAY'
            : !isScanNumber(s)
              ? `NS_SCAN ${s}`
              : undefined;
    if (found === undefined) continue;
    throw new InputProblem({
      code: 'bad-row',
      place: `${vis.place}, row ${row + 1}`,
      expected: 'a row in use with VISAMPERR above 0, stations in the order of OI_ARRAY, NS_SCAN from 0',
      found,
      advice: 'Give the output of a stage, or take the file through a stage of kind ingest.',
    });
  }
}
