/** Mean brightness against distance from the centre, with the bands of the posterior that hold 68 % and 95 % of the
 *  draws at each radius, and the ring's radius with its interval. */

import type { Basis, Numbers, Posterior, SkyImage } from '../data.ts';
import { type Box, clipTo, drawAxes, drawHeading, drawLegend, polyline } from '../formats/drawing/axes.ts';
import { linearScale, type Scale } from '../formats/drawing/scale.ts';
import {
  faint,
  grey,
  modelled,
  paleGrey,
  paleModelled,
  softModelled,
  truthColour,
} from '../formats/drawing/style.ts';
import { type Canvas, decimal, element, startCanvas } from '../formats/drawing/svg.ts';
import { quantiles } from '../numerics/statistics.ts';
import { brightnessRange } from './image-plot.ts';
import { angleUnit, MICROARCSEC, type Place, profileRadii, radialProfile } from './sky.ts';

export interface ProfilePlot {
  readonly heading: string;
  readonly remark: string;
  readonly image: SkyImage;
  readonly centre: Place;
  /** Largest radius, radians. */
  readonly reach: number;
  readonly posterior: { readonly basis: Basis; readonly samples: Posterior } | null;
  readonly ring: Numbers | null;
  readonly truth: { readonly image: SkyImage; readonly label: string; readonly centre: Place } | null;
}

interface Band {
  readonly low95: Float64Array;
  readonly low: Float64Array;
  readonly high: Float64Array;
  readonly high95: Float64Array;
}

const BOX: Box = { x: 84, y: 44, width: 540, height: 330 };

/** Returns the profile as SVG. */
export function drawProfile(plot: ProfilePlot): string {
  const canvas = startCanvas({
    name: 'profile',
    width: 656,
    height: 466,
    title: 'Radial profile',
    description: 'Brightness averaged over position angle against the distance from the centre.',
  });
  drawHeading(canvas, [BOX.x, BOX.x + BOX.width], plot.heading, plot.remark);
  const radii = profileRadii(plot.image, plot.centre, plot.reach);
  const image = brightnessProfile(plot.image, plot.centre, radii);
  const band = plot.posterior === null ? null : posteriorBand(plot.posterior, plot.centre, radii);
  const truth = plot.truth === null ? null : truthProfile(plot.truth, radii);
  const curves = [
    image,
    ...(band === null ? [] : [band.high95, band.low95]),
    ...(truth === null ? [] : [truth.values]),
  ];
  const range = brightnessRange(Math.max(...curves.map((curve) => Math.max(...curve))));
  const least = Math.min(0, ...curves.map((curve) => Math.min(...curve)));
  const unit = angleUnit(radii[radii.length - 1]);
  const last = radii[radii.length - 1] / unit.radians;
  const x = linearScale([0, last], [BOX.x, BOX.x + BOX.width], 7);
  const y = linearScale(
    [(1.05 * least) / range.unit, (1.08 * range.top) / range.unit],
    [BOX.y + BOX.height, BOX.y],
    6,
  );
  const line = (values: Float64Array, at = radii) =>
    polyline(
      Array.from(values, (value, k) => [x.at(at[k] / unit.radians), y.at(value / range.unit)] as const),
    );
  const layers: string[] = [ringLines(plot.ring, x, unit.radians)];
  if (band !== null) {
    layers.push(area(line(band.high95), line(band.low95.toReversed(), radii.toReversed()), paleModelled));
    layers.push(area(line(band.high), line(band.low.toReversed(), radii.toReversed()), softModelled));
  }
  layers.push(zeroLine(y));
  if (truth !== null) layers.push(stroke(line(truth.values, truth.radii), truthColour, '6 3'));
  layers.push(stroke(line(image), modelled));
  canvas.add(element('g', { 'clip-path': clipTo(canvas, 'box', BOX) }, layers));
  drawAxes(canvas, {
    box: BOX,
    x,
    y,
    xLabel: `distance from the centre (${unit.name})`,
    yLabel: range.label,
  });
  legend(canvas, plot);
  return canvas.finish();
}

function legend(canvas: Canvas, { posterior, truth, ring }: ProfilePlot): void {
  drawLegend(canvas, BOX.x, 446, [
    { text: 'image', colour: modelled, mark: 'line' },
    ...(posterior === null
      ? []
      : [
          { text: '68 %', colour: softModelled, mark: 'band' } as const,
          { text: '95 %', colour: paleModelled, mark: 'band' } as const,
        ]),
    ...(truth === null ? [] : [{ text: truth.label, colour: truthColour, mark: 'dash' } as const]),
    ...(ring?.values.diameter === undefined
      ? []
      : [{ text: 'ring radius', colour: paleGrey, mark: 'band' } as const]),
  ]);
}

/** Brightness, Jy per µas². */
function brightnessProfile(image: SkyImage, centre: Place, radii: Float64Array): Float64Array {
  const pixel = image.pixelRadians / MICROARCSEC;
  return radialProfile(image, centre, radii).map((value) => value / (pixel * pixel));
}

function truthProfile(truth: NonNullable<ProfilePlot['truth']>, wanted: Float64Array) {
  const radii = profileRadii(truth.image, truth.centre, wanted[wanted.length - 1]);
  return { radii, values: brightnessProfile(truth.image, truth.centre, radii) };
}

/** Quantiles over the draws at each radius. The profile is linear in the image, so only the mean and the components
 *  are averaged around the centre. */
function posteriorBand(
  { basis, samples }: NonNullable<ProfilePlot['posterior']>,
  centre: Place,
  radii: Float64Array,
): Band {
  const { nx, ny, pixelRadians } = basis;
  const profile = (pixels: Float64Array) =>
    brightnessProfile({ nx, ny, pixelRadians, pixels }, centre, radii);
  const mean = profile(basis.mean);
  const components = basis.components.slice(0, samples.components).map(profile);
  const n = radii.length;
  const band = [0, 1, 2, 3].map(() => new Float64Array(n)) as [
    Float64Array,
    Float64Array,
    Float64Array,
    Float64Array,
  ];
  const values = new Float64Array(samples.count);
  for (let r = 0; r < n; r++) {
    for (let s = 0; s < samples.count; s++) {
      let sum = samples.flux[s] * mean[r];
      for (let k = 0; k < components.length; k++) {
        sum += samples.coefficients[s * samples.components + k] * components[k][r];
      }
      values[s] = sum;
    }
    quantiles(values, [0.025, 0.16, 0.84, 0.975]).forEach((value, q) => {
      band[q][r] = value;
    });
  }
  return { low95: band[0], low: band[1], high: band[2], high95: band[3] };
}

function ringLines(ring: Numbers | null, x: Scale, unitRadians: number): string {
  const diameter = ring?.values.diameter;
  if (diameter === undefined) return '';
  const at = (d: number) => x.at((d / 2) * (MICROARCSEC / unitRadians));
  const d = `M${decimal(at(diameter.value))} ${decimal(BOX.y)}v${decimal(BOX.height)}`;
  const line = element('path', { d, stroke: grey, 'stroke-width': 1, 'stroke-dasharray': '2 3' });
  if (diameter.low === undefined || diameter.high === undefined) return line;
  const [left, right] = [at(diameter.low), at(diameter.high)];
  const width = Math.max(1, right - left);
  return (
    element('rect', { x: left, y: BOX.y, width, height: BOX.height, fill: paleGrey, opacity: 0.6 }) + line
  );
}

function zeroLine(y: Scale): string {
  return element('path', { d: `M${BOX.x} ${decimal(y.at(0))}h${BOX.width}`, stroke: faint });
}

function area(there: string, back: string, fill: string): string {
  return element('path', { d: `${there}L${back.slice(1)}Z`, fill });
}

function stroke(d: string, colour: string, dash?: string): string {
  return element('path', {
    d,
    fill: 'none',
    stroke: colour,
    'stroke-width': 2,
    'stroke-dasharray': dash,
    'stroke-linejoin': 'round',
  });
}
