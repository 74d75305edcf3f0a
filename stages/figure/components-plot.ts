/** Mean image and leading components of a library. Components are signed: blue is negative, yellow positive, and a grey
 *  copy still shows the sign. Each has its own range; the share of the library's variance stands beneath. */

import type { Basis } from '../data.ts';
import { drawHeading } from '../formats/drawing/axes.ts';
import { brightness, signed } from '../formats/drawing/colour.ts';
import { rasterImage } from '../formats/drawing/raster.ts';
import { roundStep } from '../formats/drawing/scale.ts';
import { grey, ink, overlay, type } from '../formats/drawing/style.ts';
import { type Canvas, decimal, element, startCanvas } from '../formats/drawing/svg.ts';
import { setText } from '../formats/drawing/text.ts';
import { drawColourBar } from './image-plot.ts';
import { angleUnit } from './sky.ts';

const MEAN = 284;
const SMALL = 132;
const PITCH = { x: 144, y: 162 };
const TOP = 44;
const LEFT = 24;
const COLUMNS = 4;

/** Returns mean and the first `shown` components as SVG. */
export function drawComponents(basis: Basis, shown: number, remark: string): string {
  const count = Math.min(shown, basis.components.length);
  const canvas = startCanvas({
    name: 'components',
    width: LEFT + MEAN + 28 + COLUMNS * PITCH.x + 102,
    height: TOP + 3 * PITCH.y + 6,
    title: 'Mean and leading components of the library',
    description: `The mean image and the first ${count} of ${basis.components.length} principal components.`,
  });
  const right = LEFT + MEAN + 28 + (COLUMNS - 1) * PITCH.x + SMALL;
  drawHeading(canvas, [LEFT, right], `${basis.families.length} images of the library`, remark);
  drawMean(canvas, basis);
  const first = LEFT + MEAN + 28;
  for (let k = 0; k < count; k++) {
    const x = first + (k % COLUMNS) * PITCH.x;
    const y = TOP + Math.floor(k / COLUMNS) * PITCH.y;
    drawComponent(canvas, basis, k, x, y);
  }
  const bar = { x: right + 18, y: TOP, width: 14, height: 2 * PITCH.y + SMALL };
  drawColourBar(canvas, bar, signed, [-1, 1], 'fraction of the largest value');
  return canvas.finish();
}

function drawMean(canvas: Canvas, basis: Basis): void {
  const { nx, ny, mean, pixelRadians } = basis;
  const height = (MEAN * ny) / nx;
  const box = { x: LEFT, y: TOP, width: MEAN, height };
  const grid = { nx, ny, pixels: mean };
  canvas.add(rasterImage(grid, whole(nx, ny), [0, Math.max(...mean)], brightness, box));
  const field = nx * pixelRadians;
  const unit = angleUnit(field / 2);
  const length = roundStep(field / 4 / unit.radians);
  const px = ((length * unit.radians) / field) * MEAN;
  const [x, y] = [LEFT + 16, TOP + height - 18];
  canvas.add(
    element('path', {
      d: `M${decimal(x)} ${decimal(y)}h${decimal(px)}`,
      stroke: overlay,
      'stroke-width': 2.5,
    }),
  );
  const text = `${decimal(length, 6)} ${unit.name}`;
  setText(canvas, text, { x: x + px / 2, y: y - 8, size: type.tick, anchor: 'middle', fill: overlay });
  const below = TOP + height + 20;
  setText(canvas, 'mean', { x: LEFT, y: below, size: type.tick, fill: ink });
  const resolution = angleUnit(basis.resolutionRadians || pixelRadians);
  const words = [
    `${nx} × ${ny} pixels of ${(pixelRadians / angleUnit(pixelRadians).radians).toFixed(2)} ${angleUnit(pixelRadians).name}`,
  ];
  if (basis.resolutionRadians > 0) {
    words.push(`resolution ${(basis.resolutionRadians / resolution.radians).toFixed(1)} ${resolution.name}`);
  }
  words.forEach((line, k) => {
    setText(canvas, line, { x: LEFT, y: below + 20 + 18 * k, size: type.small, fill: grey });
  });
}

function drawComponent(canvas: Canvas, basis: Basis, k: number, x: number, y: number): void {
  const { nx, ny } = basis;
  const pixels = basis.components[k];
  let most = 0;
  for (const value of pixels) most = Math.max(most, Math.abs(value));
  const range = most > 0 ? ([-most, most] as const) : ([-1, 1] as const);
  canvas.add(
    rasterImage({ nx, ny, pixels }, whole(nx, ny), range, signed, { x, y, width: SMALL, height: SMALL }),
  );
  const share = (100 * basis.eigenvalues[k]) / basis.totalVariance;
  setText(canvas, String(k + 1), { x, y: y + SMALL + 18, size: type.tick, fill: ink });
  setText(canvas, `${share.toFixed(share < 0.1 ? 3 : share < 1 ? 2 : 1)} %`, {
    x: x + SMALL,
    y: y + SMALL + 18,
    size: type.small,
    anchor: 'end',
    fill: grey,
  });
}

function whole(nx: number, ny: number) {
  return { x0: -0.5, x1: nx - 0.5, y0: -0.5, y1: ny - 0.5 };
}
