/** Histograms over the posterior, each with its median, the 68 % interval and, where it is known, the truth. Bins by
 *  2 IQR n^(-1/3) (Freedman and Diaconis 1981, Z. Wahrscheinlichkeitstheorie verw. Gebiete 57, 453). */

import { type Box, drawAxes, drawHeading, drawLegend } from '../formats/drawing/axes.ts';
import { roundedNumber } from '../formats/drawing/rounding.ts';
import { linearScale, type Scale } from '../formats/drawing/scale.ts';
import {
  grey,
  ink,
  modelled,
  paleModelled,
  softModelled,
  truthColour,
  type,
} from '../formats/drawing/style.ts';
import { type Canvas, decimal, element, startCanvas } from '../formats/drawing/svg.ts';
import { setText, textWidth } from '../formats/drawing/text.ts';
import { pow } from '../numerics/elementary.ts';
import { quantiles } from '../numerics/statistics.ts';

export interface Marginal {
  readonly name: string;
  /** As it is written: `µas`, `°`, `Jy`; empty for a ratio. */
  readonly unit: string;
  readonly values: Float64Array;
  readonly truth?: number;
}

export interface PosteriorPlot {
  readonly heading: string;
  readonly remark: string;
  readonly marginals: readonly Marginal[];
  /** A sentence on the draws. */
  readonly note: string;
}

const PANEL = { width: 240, height: 150 };
const PITCH = { x: 278, y: 236 };
const COLUMNS = 3;
const LEFT = 28;
const TOP = 92;

/** Returns the histograms as SVG, three a row. */
export function drawPosterior(plot: PosteriorPlot): string {
  const marginals = plot.marginals.filter(({ values }) => values.length > 0);
  const rows = Math.ceil(marginals.length / COLUMNS);
  const canvas = startCanvas({
    name: 'posterior',
    width: LEFT + COLUMNS * PITCH.x - (PITCH.x - PANEL.width) + LEFT,
    height: TOP + rows * PITCH.y + 2,
    title: 'Posterior',
    description: `Histograms of ${marginals.map(({ name }) => name).join(', ')}. ${plot.note}`,
  });
  drawHeading(canvas, [LEFT, canvas.width - LEFT], plot.heading, plot.remark);
  marginals.forEach((marginal, k) => {
    const x = LEFT + (k % COLUMNS) * PITCH.x;
    const y = TOP + Math.floor(k / COLUMNS) * PITCH.y;
    drawMarginal(canvas, marginal, { x, y, ...PANEL });
  });
  const below = canvas.height - 12;
  const withTruth = marginals.some(({ truth }) => truth !== undefined);
  const end = drawLegend(canvas, LEFT, below, [
    { text: 'draws', colour: paleModelled, mark: 'band' },
    { text: '68 %', colour: softModelled, mark: 'band' },
    { text: 'median', colour: modelled, mark: 'line' },
    ...(withTruth ? [{ text: 'truth', colour: truthColour, mark: 'dash' } as const] : []),
  ]);
  setText(canvas, plot.note, { x: end + 28, y: below, size: type.small, fill: grey });
  return canvas.finish();
}

function drawMarginal(canvas: Canvas, marginal: Marginal, box: Box): void {
  const [first, low, middle, high, last] = quantiles(marginal.values, [0, 0.16, 0.5, 0.84, 1]);
  const unit = marginal.unit === '' ? '' : ` (${marginal.unit})`;
  setText(canvas, `${marginal.name}${unit}`, { x: box.x, y: box.y - 26, size: type.tick, fill: ink });
  const value = roundedNumber(middle, low, high);
  setText(canvas, value, { x: box.x, y: box.y - 8, size: type.small, fill: grey });
  const { truth } = marginal;
  const span = [first, last, ...(truth === undefined ? [] : [truth])];
  const margin = 0.04 * (Math.max(...span) - Math.min(...span)) || Math.abs(middle) * 0.1 || 1;
  const domain = [Math.min(...span) - margin, Math.max(...span) + margin] as const;
  const x = spaciousScale(domain, [box.x, box.x + box.width]);
  const bins = histogram(marginal.values);
  const y = linearScale([0, 1.08 * Math.max(...bins.counts)], [box.y + box.height, box.y]);
  canvas.add(
    bars(bins, x, y, paleModelled, [first, last]),
    bars(bins, x, y, softModelled, [low, high]),
    vertical(x.at(middle), box, modelled),
  );
  if (truth !== undefined) canvas.add(vertical(x.at(truth), box, truthColour, '6 3'));
  drawAxes(canvas, { box, x, y: { ...y, ticks: [] }, xLabel: '' });
}

/** A scale whose tick labels fill at most two thirds of its length. */
function spaciousScale(domain: readonly [number, number], range: readonly [number, number]): Scale {
  for (let about = 5; ; about--) {
    const scale = linearScale(domain, range, about);
    const filled = scale.ticks.reduce((sum, { label }) => sum + textWidth(label, type.tick), 0);
    if (about === 2 || filled < (2 / 3) * (range[1] - range[0])) return scale;
  }
}

interface Bins {
  readonly from: number;
  readonly width: number;
  readonly counts: readonly number[];
}

/** Steps below this are no steps: they would underflow. */
const LEAST_STEP = 1e-300;

/** Returns counts in equal bins over all values, at least 8 and at most 60; one bin when all are the same. */
export function histogram(values: Float64Array): Bins {
  const [first, lower, upper, last] = quantiles(values, [0, 0.25, 0.75, 1]);
  const spread = (last - first) / 60 > LEAST_STEP;
  const width = (2 * (upper - lower)) / pow(values.length, 1 / 3);
  const wanted = width > 0 ? Math.ceil((last - first) / width) : 8;
  const count = spread ? Math.min(60, Math.max(8, wanted)) : 1;
  const counts = new Array<number>(count).fill(0);
  const step = spread ? (last - first) / count : 1;
  for (const value of values) counts[Math.min(count - 1, Math.floor((value - first) / step))] += 1;
  return { from: spread ? first : first - step / 2, width: step, counts };
}

/** The part of the bars between two values, as one path. */
function bars(bins: Bins, x: Scale, y: Scale, fill: string, [low, high]: readonly [number, number]): string {
  let d = '';
  bins.counts.forEach((count, k) => {
    const left = Math.max(
      bins.from + k * bins.width,
      bins.counts.length > 1 ? low : Number.NEGATIVE_INFINITY,
    );
    const right = Math.min(
      bins.from + (k + 1) * bins.width,
      bins.counts.length > 1 ? high : Number.POSITIVE_INFINITY,
    );
    if (count === 0 || !(right > left)) return;
    d += `M${decimal(x.at(left))} ${decimal(y.at(0))}V${decimal(y.at(count))}H${decimal(x.at(right))}V${decimal(y.at(0))}Z`;
  });
  return element('path', { d, fill });
}

function vertical(x: number, box: Box, colour: string, dash?: string): string {
  const d = `M${decimal(x)} ${decimal(box.y)}v${decimal(box.height)}`;
  return element('path', { d, stroke: colour, 'stroke-width': 2, 'stroke-dasharray': dash });
}
