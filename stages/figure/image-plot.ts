/** The image in false colour, with scale bar, beam, compass and colour bar, the ring lightly over it, and the truth of
 *  synthetic data beside it at the same scale of sky and brightness. North is up, east is left. */

import type { Numbers, SkyImage } from '../data.ts';
import { type Box, drawHeading } from '../formats/drawing/axes.ts';
import { brightness, type ColourMap, colourAt } from '../formats/drawing/colour.ts';
import { rasterImage } from '../formats/drawing/raster.ts';
import { roundedNumber } from '../formats/drawing/rounding.ts';
import { linearScale, roundStep } from '../formats/drawing/scale.ts';
import { grey, ink, overlay, type } from '../formats/drawing/style.ts';
import { type Canvas, decimal, element, startCanvas } from '../formats/drawing/svg.ts';
import { setText, textWidth } from '../formats/drawing/text.ts';
import { cos, sin } from '../numerics/elementary.ts';
import type { Beam } from './beam.ts';
import { angleUnit, MICROARCSEC, type Place } from './sky.ts';

export interface ImagePlot {
  readonly heading: string;
  readonly remark: string;
  readonly image: SkyImage;
  /** Width of the sky shown, radians. */
  readonly field: number;
  readonly beam: Beam | null;
  readonly ring: Numbers | null;
  /** Where the ring's centre is in the image. */
  readonly centre: Place;
  readonly truth: { readonly image: SkyImage; readonly label: string } | null;
}

const SIDE = 380;
const TOP = 44;
const GAP = 20;
const LEFT = 24;

/** Returns the image as SVG. */
export function drawImage(plot: ImagePlot): string {
  const panels = plot.truth === null ? 1 : 2;
  const right = LEFT + panels * SIDE + (panels - 1) * GAP;
  const canvas = startCanvas({
    name: 'image',
    width: right + 104,
    height: TOP + SIDE + (plot.truth === null ? 42 : 62),
    title: plot.heading === '' ? 'Image' : `Image of ${plot.heading}`,
    description: 'Brightness in false colour; north is up, east is left.',
  });
  drawHeading(canvas, [LEFT, right], plot.heading, plot.remark);
  const peak = Math.max(
    peakBrightness(plot.image),
    plot.truth === null ? 0 : peakBrightness(plot.truth.image),
  );
  const range = brightnessRange(peak);
  const box = { x: LEFT, y: TOP, width: SIDE, height: SIDE };
  drawSky(canvas, plot.image, box, plot.field, range.top);
  drawRing(canvas, plot, box);
  drawScaleBar(canvas, box, plot.field);
  drawCompass(canvas, box);
  if (plot.beam !== null) drawBeam(canvas, plot.beam, box, plot.field);
  caption(canvas, box, plot.truth === null ? '' : 'reconstruction', describeImage(plot));
  if (plot.truth !== null) {
    const beside = { ...box, x: LEFT + SIDE + GAP };
    drawSky(canvas, plot.truth.image, beside, plot.field, range.top);
    caption(canvas, beside, plot.truth.label, `flux ${fluxText(plot.truth.image)}`);
  }
  drawColourBar(
    canvas,
    { x: right + 18, y: TOP, width: 16, height: SIDE },
    brightness,
    [0, range.top / range.unit],
    range.label,
  );
  return canvas.finish();
}

/** Draws a picture of the middle `field` of an image; an image that is smaller leaves a dark margin.
 *  @param top  brightness of the last colour, Jy per µas² */
function drawSky(canvas: Canvas, image: SkyImage, box: Box, field: number, top: number): void {
  const { nx, ny, pixelRadians, pixels } = image;
  const wanted = field / pixelRadians;
  const [wide, high] = [Math.min(nx, wanted), Math.min(ny, wanted)];
  const [cx, cy] = [(nx - 1) / 2, (ny - 1) / 2];
  const window = { x0: cx - wide / 2, x1: cx + wide / 2, y0: cy - high / 2, y1: cy + high / 2 };
  const [width, height] = [(wide / wanted) * box.width, (high / wanted) * box.height];
  const place = { x: box.x + (box.width - width) / 2, y: box.y + (box.height - height) / 2, width, height };
  const range = [0, top * squareMicroarcsec(image)] as const;
  canvas.add(element('rect', { ...box, fill: colourAt(brightness, 0) }));
  canvas.add(rasterImage({ nx, ny, pixels }, window, range, brightness, place));
}

function drawRing(canvas: Canvas, plot: ImagePlot, box: Box): void {
  const diameter = plot.ring?.values.diameter;
  if (diameter === undefined) return;
  const scale = box.width / plot.field;
  const radius = (diameter.value / 2) * MICROARCSEC * scale;
  const cx = box.x + box.width / 2 - plot.centre.east * scale;
  const cy = box.y + box.height / 2 - plot.centre.north * scale;
  const line = { fill: 'none', stroke: overlay, 'stroke-width': 1.2, opacity: 0.75 };
  canvas.add(
    element('circle', { ...line, cx, cy, r: radius, 'stroke-dasharray': '2 5', 'stroke-linecap': 'round' }),
  );
  const angle = plot.ring?.values['position-angle'];
  if (angle === undefined) return;
  const radians = (angle.value * Math.PI) / 180;
  const [east, north] = [sin(radians), cos(radians)];
  const at = (r: number) => `${decimal(cx - r * east)} ${decimal(cy - r * north)}`;
  canvas.add(
    element('path', { ...line, d: `M${at(radius + 8)}L${at(radius + 26)}`, 'stroke-linecap': 'round' }),
  );
}

function drawScaleBar(canvas: Canvas, box: Box, field: number): void {
  const unit = angleUnit(field / 2);
  const length = roundStep(field / 4 / unit.radians);
  const px = ((length * unit.radians) / field) * box.width;
  const [x, y] = [box.x + 20, box.y + box.height - 20];
  canvas.add(
    element('path', {
      d: `M${decimal(x)} ${decimal(y)}h${decimal(px)}`,
      stroke: overlay,
      'stroke-width': 2.5,
    }),
  );
  setText(canvas, `${decimal(length, 6)} ${unit.name}`, {
    x: x + px / 2,
    y: y - 9,
    size: type.label,
    anchor: 'middle',
    fill: overlay,
  });
}

function drawCompass(canvas: Canvas, box: Box): void {
  const [x, y] = [box.x + 62, box.y + 64];
  const d = `M${x} ${y}v-28m-4 7l4 -7l4 7M${x} ${y}h-28m7 -4l-7 4l7 4`;
  canvas.add(element('path', { d, fill: 'none', stroke: overlay, 'stroke-width': 1.4 }));
  setText(canvas, 'N', { x, y: y - 34, size: type.label, anchor: 'middle', fill: overlay });
  setText(canvas, 'E', {
    x: x - 40,
    y,
    size: type.label,
    anchor: 'middle',
    vertical: 'middle',
    fill: overlay,
  });
}

function drawBeam(canvas: Canvas, beam: Beam, box: Box, field: number): void {
  const scale = box.width / field;
  const [rx, ry] = [(beam.minor / 2) * scale, (beam.major / 2) * scale];
  const unit = angleUnit(beam.minor);
  const size = `${(beam.major / unit.radians).toFixed(0)} × ${(beam.minor / unit.radians).toFixed(0)} ${unit.name}`;
  const label = `beam ${size}`;
  const half = Math.max(textWidth(label, type.tick) / 2, rx, ry);
  const cx = box.x + box.width - 18 - half;
  const cy = box.y + box.height - 36 - Math.max(rx, ry);
  // North through east runs against the turning of SVG.
  const transform = `rotate(${decimal(-beam.positionAngleDegrees)} ${decimal(cx)} ${decimal(cy)})`;
  canvas.add(
    element('ellipse', { cx, cy, rx, ry, transform, fill: 'none', stroke: overlay, 'stroke-width': 1.2 }),
  );
  setText(canvas, label, {
    x: cx,
    y: box.y + box.height - 17,
    size: type.tick,
    anchor: 'middle',
    fill: overlay,
  });
}

function caption(canvas: Canvas, box: Box, left: string, right: string): void {
  const y = box.y + box.height + 22;
  if (left !== '') setText(canvas, left, { x: box.x, y, size: type.tick, fill: ink });
  const below = left === '' ? y : y + 20;
  setText(canvas, right, { x: box.x, y: below, size: type.small, fill: grey });
}

function describeImage({ image, ring }: ImagePlot): string {
  const words = [`flux ${fluxText(image)}`];
  const diameter = ring?.values.diameter;
  if (diameter !== undefined) {
    const { value, low, high } = diameter;
    words.push(`diameter ${roundedNumber(value, low ?? null, high ?? null)} µas`);
  }
  return words.join('  ·  ');
}

function fluxText({ pixels }: SkyImage): string {
  let sum = 0;
  for (const value of pixels) sum += value;
  return `${sum.toPrecision(3)} Jy`;
}

/** Draws a vertical colour bar with ticks and a label at its right. */
export function drawColourBar(
  canvas: Canvas,
  box: Box,
  map: ColourMap,
  domain: readonly [number, number],
  label: string,
): void {
  const ramp = Float64Array.from({ length: 256 }, (_, k) => k);
  const grid = { nx: 1, ny: 256, pixels: ramp };
  canvas.add(rasterImage(grid, { x0: -0.5, x1: 0.5, y0: 0, y1: 255 }, [0, 255], map, box));
  canvas.add(element('rect', { ...box, fill: 'none', stroke: ink, 'stroke-width': 1 }));
  const scale = linearScale(domain, [box.y + box.height, box.y], 5);
  for (const { value, label: text } of scale.ticks) {
    const y = scale.at(value);
    canvas.add(element('path', { d: `M${decimal(box.x + box.width)} ${decimal(y)}h4`, stroke: ink }));
    setText(canvas, text, { x: box.x + box.width + 8, y, size: type.tick, vertical: 'middle', fill: ink });
  }
  setText(canvas, label, {
    x: box.x + box.width + 62,
    y: box.y + box.height / 2,
    size: type.label,
    anchor: 'middle',
    rotate: -90,
    fill: ink,
  });
}

/** Jy per µas². */
function peakBrightness(image: SkyImage): number {
  let peak = 0;
  for (const value of image.pixels) peak = Math.max(peak, value);
  return peak / squareMicroarcsec(image);
}

function squareMicroarcsec({ pixelRadians }: SkyImage): number {
  return (pixelRadians / MICROARCSEC) * (pixelRadians / MICROARCSEC);
}

/** Brightness of the last colour, and the unit in which it is written. */
export function brightnessRange(peak: number): {
  readonly top: number;
  readonly unit: number;
  readonly label: string;
} {
  const units = [
    { unit: 1, name: 'Jy' },
    { unit: 1e-3, name: 'mJy' },
    { unit: 1e-6, name: 'µJy' },
    { unit: 1e-9, name: 'nJy' },
  ];
  const top = peak > 0 ? peak : 1;
  const { unit, name } = units.find((each) => top >= 0.5 * each.unit) ?? units[3];
  return { top, unit, label: `brightness (${name} µas⁻²)` };
}
