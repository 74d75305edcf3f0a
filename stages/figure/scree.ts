/** The spectrum of a library: the variance along each component as a fraction of all, and how much the leading ones
 *  explain together. */

import type { Basis } from '../data.ts';
import { type Box, drawAxes, drawHeading, markers, polyline } from '../formats/drawing/axes.ts';
import { linearScale, logScale, type Scale } from '../formats/drawing/scale.ts';
import { grey, ink, measured, type } from '../formats/drawing/style.ts';
import { type Canvas, element, startCanvas } from '../formats/drawing/svg.ts';
import { setText } from '../formats/drawing/text.ts';

const LEFT_BOX: Box = { x: 88, y: 44, width: 350, height: 310 };
const RIGHT_BOX: Box = { ...LEFT_BOX, x: 530 };

/** Returns the scree plot as SVG. */
export function drawScree(basis: Basis, remark: string): string {
  const canvas = startCanvas({
    name: 'scree',
    width: 908,
    height: 420,
    title: 'Variance of the components',
    description: `Fractions of the variance of ${basis.families.length} images that ${basis.eigenvalues.length} components hold.`,
  });
  drawHeading(
    canvas,
    [LEFT_BOX.x, RIGHT_BOX.x + RIGHT_BOX.width],
    `${basis.families.length} images of the library`,
    remark,
  );
  const shares = Array.from(basis.eigenvalues, (value) => value / basis.totalVariance);
  drawSpectrum(canvas, shares);
  drawExplained(canvas, shares);
  return canvas.finish();
}

function drawSpectrum(canvas: Canvas, shares: readonly number[]): void {
  const x = componentScale(shares.length, LEFT_BOX);
  const positive = shares.filter((share) => share > 0);
  const [least, most] = [Math.min(...positive), Math.max(...positive)];
  const y = logScale([Math.max(least, 1e-12) / 1.6, most * 1.6], [LEFT_BOX.y + LEFT_BOX.height, LEFT_BOX.y]);
  const points = shares.flatMap((share, k) =>
    share > 0 ? [{ x: x.at(k + 1), y: y.at(Math.max(share, 1e-12)) }] : [],
  );
  canvas.add(line(points), markers(points, measured, 5));
  drawAxes(canvas, {
    box: LEFT_BOX,
    x,
    y,
    xLabel: 'component',
    yLabel: 'fraction of the variance',
    yLabelAt: 62,
  });
}

function drawExplained(canvas: Canvas, shares: readonly number[]): void {
  const x = componentScale(shares.length, RIGHT_BOX);
  const y = linearScale([0, 104], [RIGHT_BOX.y + RIGHT_BOX.height, RIGHT_BOX.y], 5);
  let sum = 0;
  const explained = shares.map((share) => {
    sum += 100 * share;
    return sum;
  });
  const points = explained.map((value, k) => ({ x: x.at(k + 1), y: y.at(value) }));
  canvas.add(line(points), markers(points, measured, 5));
  drawAxes(canvas, {
    box: RIGHT_BOX,
    x,
    y,
    xLabel: 'components',
    yLabel: 'explained variance (%)',
    yLabelAt: 54,
  });
  const lines = [90, 95, 99].flatMap((level) => {
    const reached = explained.findIndex((value) => value >= level);
    return reached < 0 ? [] : [`${reached + 1} explain ${level} %`];
  });
  lines.push(`all ${explained.length} explain ${(explained.at(-1) ?? 0).toFixed(1)} %`);
  lines.forEach((text, k) => {
    const place = {
      x: RIGHT_BOX.x + RIGHT_BOX.width - 14,
      y: RIGHT_BOX.y + RIGHT_BOX.height - 18 - 20 * (lines.length - 1 - k),
    };
    setText(canvas, text, {
      ...place,
      size: type.small,
      anchor: 'end',
      fill: k === lines.length - 1 ? ink : grey,
    });
  });
}

/** A scale over 1 … count with whole numbers as ticks. */
function componentScale(count: number, box: Box): Scale {
  const scale = linearScale([0, count + 1], [box.x, box.x + box.width], Math.min(8, count + 1));
  const ticks = scale.ticks.filter(({ value }) => Number.isInteger(value) && value >= 1 && value <= count);
  return { ...scale, ticks };
}

function line(points: readonly { x: number; y: number }[]): string {
  const d = polyline(points.map(({ x, y }) => [x, y] as const));
  return element('path', { d, fill: 'none', stroke: grey, 'stroke-width': 1 });
}
