/** Amplitudes and closure phases (of optical data squared visibilities and triple phases) against baseline length, each with the model and, below, the residual in units of its
 *  standard deviation. */

import {
  type Box,
  clipTo,
  drawAxes,
  drawHeading,
  drawLegend,
  type Marker,
  markers,
} from '../formats/drawing/axes.ts';
import { linearScale, logScale, type Scale } from '../formats/drawing/scale.ts';
import { faint, grey, ink, measured, modelled, type } from '../formats/drawing/style.ts';
import { type Canvas, decimal, element, startCanvas } from '../formats/drawing/svg.ts';
import { setText } from '../formats/drawing/text.ts';
import { wavelengthUnit } from './coverage.ts';

/** Data of one sort with the model's values. */
export interface DataSeries {
  /** Wavelengths: the baseline, or the longest baseline of a triangle. */
  readonly length: Float64Array;
  /** Jy, or degrees. */
  readonly observed: Float64Array;
  readonly sigma: Float64Array;
  readonly model: Float64Array;
  /** Observed less model over sigma, phases wrapped. */
  readonly residual: Float64Array;
}

export interface DataPlot {
  readonly heading: string;
  readonly remark: string;
  readonly amplitudes: DataSeries | null;
  readonly closurePhases: DataSeries | null;
  /** Of optical data. */
  readonly squared?: DataSeries;
  readonly triplePhases?: DataSeries;
  /** A sentence on the calibration, or nothing. */
  readonly calibration: string;
}

interface Column {
  readonly name: string;
  readonly series: DataSeries;
  readonly label: string;
  readonly lengthLabel: string;
  readonly scale: (range: readonly [number, number]) => Scale;
}

const MAIN = { y: 44, height: 290 };
const LOWER = { y: 356, height: 92 };
const WIDTH = 370;

/** Returns the data plot as SVG, one column per sort of data that is there. */
export function drawData(plot: DataPlot): string {
  const columns = columnsOf(plot);
  const canvas = startCanvas({
    name: 'data',
    width: Math.max(1, columns.length) * (WIDTH + 96) + 24,
    height: 540,
    title: 'Data, model and residuals',
    description: columns.map((column) => `${column.series.length.length} ${column.name}`).join(', '),
  });
  drawHeading(canvas, [88, canvas.width - 32], plot.heading, plot.remark);
  columns.forEach((column, k) => {
    drawColumn(canvas, column, 88 + k * (WIDTH + 96));
  });
  if (columns.length === 0) setText(canvas, 'No data.', { x: 40, y: 100, fill: grey });
  drawLegend(canvas, 88, 520, [
    { text: 'measured', colour: measured, mark: 'dot' },
    { text: 'model', colour: modelled, mark: 'dot' },
  ]);
  if (plot.calibration !== '') {
    const x = canvas.width - 32;
    setText(canvas, plot.calibration, { x, y: 520, size: type.small, anchor: 'end', fill: grey });
  }
  return canvas.finish();
}

function columnsOf({ amplitudes, closurePhases, squared, triplePhases }: DataPlot): Column[] {
  const triangle = 'longest baseline of the triangle';
  const sorts = [
    {
      name: 'amplitudes',
      series: amplitudes,
      label: 'amplitude (Jy)',
      lengthLabel: 'baseline',
      scale: amplitudeScale,
    },
    {
      name: 'squared visibilities',
      series: squared,
      label: 'squared visibility',
      lengthLabel: 'baseline',
      scale: squaredScale,
    },
    {
      name: 'closure phases',
      series: closurePhases,
      label: 'closure phase (°)',
      lengthLabel: triangle,
      scale: phaseScale,
    },
    {
      name: 'triple phases',
      series: triplePhases,
      label: 'triple phase (°)',
      lengthLabel: triangle,
      scale: phaseScale,
    },
  ];
  return sorts.flatMap(({ series, scale, ...sort }): Column[] =>
    series && series.length.length > 0 ? [{ ...sort, series, scale: (range) => scale(series, range) }] : [],
  );
}

function drawColumn(canvas: Canvas, column: Column, left: number): void {
  const { series, name } = column;
  const unit = wavelengthUnit(Math.max(...series.length));
  const main: Box = { x: left, width: WIDTH, ...MAIN };
  const lower: Box = { x: left, width: WIDTH, ...LOWER };
  const most = (1.04 * Math.max(...series.length)) / unit.wavelengths;
  const x = linearScale([0, most], [left, left + WIDTH], 6);
  const y = column.scale([main.y + main.height - 4, main.y + 4]);
  const px = (k: number) => x.at(series.length[k] / unit.wavelengths);
  const id = name.replaceAll(' ', '-');
  const observed = Array.from(series.observed, (value, k) =>
    observedMarker(px(k), value, series.sigma[k], y),
  );
  const model = Array.from(series.model, (value, k) => ({ x: px(k), y: y.at(within(value, y)) }));
  canvas.add(
    element('g', { 'clip-path': clipTo(canvas, id, main) }, [
      markers(observed, measured, 4.4),
      markers(model, modelled, 2.8),
    ]),
  );
  drawAxes(canvas, { box: main, x: bare(x), y, yLabel: column.label, yLabelAt: 56 });
  drawResiduals(canvas, series, lower, px);
  const residualScale = residualAxis(series, lower);
  const xLabel = `${column.lengthLabel} (${unit.name})`;
  drawAxes(canvas, { box: lower, x, y: residualScale, xLabel, yLabel: 'residual (σ)', yLabelAt: 56 });
}

function drawResiduals(canvas: Canvas, series: DataSeries, box: Box, px: (k: number) => number): void {
  const y = residualAxis(series, box);
  const band = element('rect', {
    x: box.x,
    y: y.at(1),
    width: box.width,
    height: y.at(-1) - y.at(1),
    fill: faint,
  });
  const zero = element('path', {
    d: `M${decimal(box.x)} ${decimal(y.at(0))}h${decimal(box.width)}`,
    stroke: grey,
  });
  const points = Array.from(series.residual, (value, k) => ({ x: px(k), y: y.at(value) }));
  canvas.add(band, zero, markers(points, measured, 3.4));
  let sum = 0;
  for (const value of series.residual) sum += value * value;
  const text = `mean square ${(sum / series.residual.length).toFixed(2)}`;
  const place = { x: box.x + box.width, y: box.y - 5, anchor: 'end' } as const;
  setText(canvas, text, { ...place, size: type.small, fill: ink });
}

/** Symmetric, wide enough for every residual and never narrower than four standard deviations. */
function residualAxis(series: DataSeries, box: Box): Scale {
  let most = 4;
  for (const value of series.residual) most = Math.max(most, 1.1 * Math.abs(value));
  return linearScale([-most, most], [box.y + box.height, box.y], 4);
}

/** Logarithmic when the model spans more than a factor of 20. */
function amplitudeScale({ observed, model, sigma }: DataSeries, range: readonly [number, number]): Scale {
  let [least, most] = [Number.POSITIVE_INFINITY, 0];
  for (let k = 0; k < model.length; k++) {
    least = Math.min(least, model[k], Math.max(observed[k], sigma[k]));
    most = Math.max(most, model[k], observed[k] + sigma[k]);
  }
  if (!(most > 0)) return linearScale([0, 1], range);
  return most / least > 20
    ? logScale([Math.max(least, 1e-4 * most) / 1.3, most * 1.3], range)
    : linearScale([0, 1.06 * most], range);
}

/** Linear, below zero where the data are. */
function squaredScale({ observed, model, sigma }: DataSeries, range: readonly [number, number]): Scale {
  let [least, most] = [0, 0];
  for (let k = 0; k < model.length; k++) {
    least = Math.min(least, model[k], observed[k] - sigma[k]);
    most = Math.max(most, model[k], observed[k] + sigma[k]);
  }
  return most > least ? linearScale([1.06 * least, 1.06 * most], range) : linearScale([0, 1], range);
}

function phaseScale({ observed, model, sigma }: DataSeries, range: readonly [number, number]): Scale {
  let most = 5;
  for (let k = 0; k < model.length; k++) {
    most = Math.max(most, Math.abs(model[k]), Math.abs(observed[k]) + sigma[k]);
  }
  if (most < 100) return linearScale([-1.1 * most, 1.1 * most], range, 6);
  const scale = linearScale([-180, 180], range, 8);
  return {
    ...scale,
    ticks: [-180, -90, 0, 90, 180].map((value) => ({ value, label: String(value).replace('-', '−') })),
  };
}

function observedMarker(x: number, value: number, sigma: number, y: Scale): Marker {
  return {
    x,
    y: y.at(within(value, y)),
    bar: [y.at(within(value + sigma, y)), y.at(within(value - sigma, y))],
  };
}

/** A value moved to the nearest end of the scale when it lies outside. */
function within(value: number, { domain }: Scale): number {
  return Math.min(domain[1], Math.max(domain[0], value));
}

function bare(scale: Scale): Scale {
  return { ...scale, ticks: scale.ticks.map(({ value }) => ({ value, label: '' })) };
}
