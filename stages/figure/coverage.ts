/** The (u,v) coverage: which points of the Fourier plane were measured. u grows to the left, as east does on the sky.
 *  Dotted circles have the fringe spacing written on them. */

import type { Visibilities } from '../data.ts';
import { clipTo, drawAxes, drawHeading, drawLegend, markers } from '../formats/drawing/axes.ts';
import { linearScale, powerOfTen } from '../formats/drawing/scale.ts';
import { grey, ink, measured, paleGrey, type } from '../formats/drawing/style.ts';
import { type Canvas, decimal, element, startCanvas } from '../formats/drawing/svg.ts';
import { setText } from '../formats/drawing/text.ts';
import { pointsOf } from '../imaging/points.ts';
import { log10 } from '../numerics/elementary.ts';
import { angleUnit } from './sky.ts';

const SIDE = 460;
const conjugate = paleGrey;

/** Returns the coverage as SVG. @throws InternalError without visibilities. */
export function drawCoverage(visibilities: Visibilities): string {
  const { target } = visibilities;
  const [u, v] = measuredPoints(visibilities);
  const unit = wavelengthUnit(longest(u, v));
  const canvas = startCanvas({
    name: 'coverage',
    width: 580,
    height: 622,
    title: `(u,v) coverage of ${target.name}`,
    description: `${u.length} points of ${visibilities.stations.length} stations and their conjugates, ${unit.name}.`,
  });
  const limit = 1.06 * (longest(u, v) / unit.wavelengths);
  const box = { x: 88, y: 44, width: SIDE, height: SIDE };
  drawHeading(canvas, [box.x, box.x + SIDE], target.name, visibilities.remark);
  const x = linearScale([limit, -limit], [box.x, box.x + SIDE], 7);
  const y = linearScale([-limit, limit], [box.y + SIDE, box.y], 7);
  canvas.add(
    element('path', { d: cross(x.at(0), y.at(0), box), stroke: paleGrey, 'stroke-width': 1, fill: 'none' }),
  );
  const point = (sign: number) => (_: unknown, k: number) => ({
    x: x.at((sign * u[k]) / unit.wavelengths),
    y: y.at((sign * v[k]) / unit.wavelengths),
  });
  const every = Array.from({ length: u.length });
  const clip = clipTo(canvas, 'plane', box);
  const points = [markers(every.map(point(-1)), conjugate, 4), markers(every.map(point(1)), measured, 4)];
  canvas.add(element('g', { 'clip-path': clip }, points));
  drawFringes(canvas, box, SIDE / 2 / limit / unit.wavelengths, limit * unit.wavelengths);
  drawAxes(canvas, { box, x, y, xLabel: `*u* (${unit.name})`, yLabel: `*v* (${unit.name})`, yLabelAt: 54 });
  drawLegend(canvas, box.x, 580, [
    { text: 'measured', colour: measured, mark: 'dot' },
    { text: 'conjugate', colour: conjugate, mark: 'dot' },
  ]);
  setText(canvas, describeData(visibilities), { x: box.x, y: 604, size: type.small, fill: grey });
  return canvas.finish();
}

/** Where the Fourier plane was measured, wavelengths: visibilities, squared visibilities, or else the sides of triangles. */
export function measuredPoints(visibilities: Visibilities): [u: Float64Array, v: Float64Array] {
  const { count, squared, triples } = visibilities;
  const points = pointsOf({ ...visibilities, ...(squared ? { triples: undefined } : {}) });
  const end = count + (squared?.count ?? 3 * (triples?.count ?? 0));
  return [points.u.subarray(0, end), points.v.subarray(0, end)];
}

function describeData(visibilities: Visibilities): string {
  const { stations, wavelengthMetres } = visibilities;
  const sides = sidesOf(visibilities);
  const present = new Set(sides.flat());
  const baselines = new Set(sides.map(([a, b]) => Math.min(a, b) * stations.length + Math.max(a, b)));
  const points = measuredPoints(visibilities)[0].length;
  const words = [`${present.size} stations`, `${baselines.size} baselines`, `${points} points`];
  return `${words.join(', ')}, ${wavelengthText(wavelengthMetres)}; circles: fringe spacing`;
}

/** The pairs of stations of the points. */
function sidesOf({ station1, station2, squared, triples }: Visibilities): [number, number][] {
  const pairs = (a: Int32Array, b: Int32Array) => Array.from(a, (each, k): [number, number] => [each, b[k]]);
  const own = pairs(station1, station2);
  if (squared) return [...own, ...pairs(squared.station1, squared.station2)];
  if (!triples) return own;
  const { station1: a, station2: b, station3: c } = triples;
  return [...own, ...pairs(a, b), ...pairs(b, c), ...pairs(a, c)];
}

function wavelengthText(metres: number): string {
  const scales: [number, string][] = [
    [1, 'm'],
    [1e-2, 'cm'],
    [1e-3, 'mm'],
    [1e-6, 'µm'],
  ];
  const [size, name] = scales.find(([each]) => metres >= each) ?? [1e-9, 'nm'];
  return `${decimal(metres / size)} ${name}`;
}

/** Two circles of round fringe spacings: the finer near the longest baseline, the other about twice as wide. */
function drawFringes(
  canvas: Canvas,
  box: { x: number; y: number },
  pxPerWavelength: number,
  limit: number,
): void {
  const centre = { x: box.x + SIDE / 2, y: box.y + SIDE / 2 };
  for (const fraction of [0.46, 0.92]) {
    const spacing = roundSpacing(1 / (fraction * limit));
    const radius = pxPerWavelength / spacing.radians;
    if (!(radius < SIDE / 2 - 4)) continue;
    canvas.add(
      element('circle', {
        cx: centre.x,
        cy: centre.y,
        r: radius,
        fill: 'none',
        stroke: grey,
        'stroke-width': 1,
        'stroke-dasharray': '1.5 4',
        'stroke-linecap': 'round',
      }),
    );
    const place = { x: centre.x + radius * Math.SQRT1_2 + 5, y: centre.y - radius * Math.SQRT1_2 - 5 };
    setText(canvas, spacing.text, { ...place, size: type.small, fill: ink, halo: '#ffffff' });
  }
}

/** The smallest of 1, 1.5, 2, 2.5, 3, 4, 5, 6, 8 times a power of ten that is not below `radians` in its own unit. */
function roundSpacing(radians: number): { radians: number; text: string } {
  const unit = angleUnit(radians);
  const value = radians / unit.radians;
  const power = powerOfTen(Math.floor(log10(value)));
  const mantissa = [1, 1.5, 2, 2.5, 3, 4, 5, 6, 8, 10].find((m) => m * power >= value) ?? 10;
  const round = mantissa * power;
  return { radians: round * unit.radians, text: `${decimal(round, 6)} ${unit.name}` };
}

/** The unit in which baselines of this length are written. */
export function wavelengthUnit(wavelengths: number): { readonly name: string; readonly wavelengths: number } {
  const units = [
    { name: 'Gλ', wavelengths: 1e9 },
    { name: 'Mλ', wavelengths: 1e6 },
    { name: 'kλ', wavelengths: 1e3 },
  ];
  return units.find((unit) => wavelengths >= 0.5 * unit.wavelengths) ?? { name: 'λ', wavelengths: 1 };
}

function longest(u: Float64Array, v: Float64Array): number {
  let most = 0;
  for (let k = 0; k < u.length; k++) most = Math.max(most, u[k] * u[k] + v[k] * v[k]);
  return Math.sqrt(most);
}

function cross(x: number, y: number, box: { x: number; y: number; width: number; height: number }): string {
  return `M${decimal(box.x)} ${decimal(y)}h${decimal(box.width)}M${decimal(x)} ${decimal(box.y)}v${decimal(box.height)}`;
}
