/** Findings of a calibration check: one bar for every check, its value over its limit, with a mark where it becomes
 *  marginal; beside it gains against time, one lane for every station or pair. */

import { type Box, clipTo, drawAxes, drawHeading, drawLegend, markers } from '../formats/drawing/axes.ts';
import { withMinus } from '../formats/drawing/minus.ts';
import { linearScale, type Scale } from '../formats/drawing/scale.ts';
import { faint, grey, ink, measured, modelled, paleGrey, type, warning } from '../formats/drawing/style.ts';
import { type Canvas, decimal, element, startCanvas } from '../formats/drawing/svg.ts';
import { setText } from '../formats/drawing/text.ts';
import type { CalibrationReport, DrawnFinding, GainLane } from './calibration-report.ts';

export interface CalibrationPlot extends CalibrationReport {
  readonly heading: string;
  readonly remark: string;
}

const TOP = 64;
const BAR_ROW = 30;
const BARS = { x: 184, width: 300 };
/** Room for values and limits right of the bars. */
const VALUES = 160;
const LANES = { x: BARS.x + BARS.width + VALUES + 100, width: 330 };
const LANE_ROW = 56;
/** Bars longer than this many limits are cut and end in an arrow. */
const MOST_LIMITS = 2;

const COLOURS = { 'within limits': measured, marginal: modelled, 'out of limits': warning } as const;

/** Returns the figure as SVG. */
export function drawCalibration(plot: CalibrationPlot): string {
  const { findings, lanes } = plot;
  const height = Math.max(findings.length * BAR_ROW, lanes.length * LANE_ROW, 60);
  const canvas = startCanvas({
    name: 'calibration',
    width: lanes.length === 0 ? BARS.x + BARS.width + VALUES : LANES.x + LANES.width + 32,
    height: TOP + height + 92,
    title: 'Findings of the calibration check',
    description: findings.map(({ check, finding }) => `${check} ${finding}`).join(', '),
  });
  drawHeading(canvas, [24, canvas.width - 32], plot.heading, plot.remark);
  if (findings.length === 0) setText(canvas, 'No check was made.', { x: 40, y: TOP + 40, fill: grey });
  else drawBars(canvas, findings, height);
  if (lanes.length > 0) drawLanes(canvas, plot, height);
  drawLegend(canvas, BARS.x, canvas.height - 12, [
    { text: 'within limits', colour: measured, mark: 'band' },
    { text: 'marginal', colour: modelled, mark: 'band' },
    { text: 'out of limits', colour: warning, mark: 'band' },
  ]);
  return canvas.finish();
}

function drawBars(canvas: Canvas, findings: readonly DrawnFinding[], height: number): void {
  const box: Box = { x: BARS.x, y: TOP, width: BARS.width, height };
  const most = Math.max(1.15, Math.min(MOST_LIMITS, 1.05 * Math.max(...findings.map(ofLimit))));
  const x = linearScale([0, most], [box.x, box.x + box.width], 5);
  const y = linearScale([0, 1], [box.y + height, box.y], 2);
  findings.forEach((finding, k) => {
    drawBar(canvas, finding, x, box.y + (k + 0.5) * BAR_ROW, most);
  });
  const limit = `M${decimal(x.at(1))} ${decimal(box.y)}v${decimal(height)}`;
  canvas.add(element('path', { d: limit, stroke: warning, 'stroke-width': 1.5 }));
  drawAxes(canvas, { box, x, y: { ...y, ticks: [] }, xLabel: 'value / limit' });
  const place = { x: box.x + box.width + 12, y: TOP - 9, size: type.small, fill: grey };
  setText(canvas, 'value (marginal, limit)', place);
}

/** A value over its limit; limits of 0 admit nothing but 0. */
function ofLimit({ value, limit }: DrawnFinding): number {
  if (limit > 0) return value / limit;
  return value > 0 ? MOST_LIMITS : 0;
}

function drawBar(canvas: Canvas, finding: DrawnFinding, x: Scale, middle: number, most: number): void {
  const { check, value, marginal, limit } = finding;
  const end = x.at(Math.min(most, ofLimit(finding)));
  const [left] = x.range;
  const bar = { x: left, y: middle - 7, width: Math.max(1, end - left), height: 14 };
  canvas.add(element('rect', { ...bar, fill: COLOURS[finding.finding] }));
  if (ofLimit(finding) > most) {
    const arrow = `M${decimal(end - 9)} ${decimal(middle - 4)}l6 4l-6 4`;
    canvas.add(element('path', { d: arrow, stroke: '#fff', 'stroke-width': 2, fill: 'none' }));
  }
  if (limit > 0) {
    const tick = `M${decimal(x.at(marginal / limit))} ${decimal(middle - 11)}v22`;
    canvas.add(element('path', { d: tick, stroke: grey, 'stroke-width': 1.5 }));
  }
  setText(canvas, check, {
    x: left - 10,
    y: middle,
    size: type.small,
    anchor: 'end',
    vertical: 'middle',
    fill: ink,
  });
  const text = `${short(value)}  (${short(marginal)}, ${short(limit)})`;
  setText(canvas, text, {
    x: x.range[1] + 12,
    y: middle,
    size: type.small,
    vertical: 'middle',
    fill: finding.finding === 'within limits' ? grey : ink,
  });
}

/** Three significant digits, without trailing zeros. */
function short(value: number): string {
  return withMinus(String(Number(value.toPrecision(3))));
}

function drawLanes(canvas: Canvas, { lanes, lanesAre }: CalibrationPlot, height: number): void {
  const box: Box = { x: LANES.x, y: TOP, width: LANES.width, height };
  const scans = lanes.flatMap((lane) => lane.scans);
  const x = linearScale([Math.min(...scans) - 1, Math.max(...scans) + 1], [box.x, box.x + box.width], 6);
  const whole = { ...x, ticks: x.ticks.filter(({ value }) => Number.isInteger(value) && value >= 0) };
  const row = height / lanes.length;
  const most = Math.max(0.3, ...lanes.flatMap((lane) => lane.logGain.map(Math.abs)));
  lanes.forEach((lane, k) => {
    drawLane(canvas, lane, x, { ...box, y: box.y + k * row, height: row }, 1.25 * most, k);
  });
  const y = linearScale([0, 1], [box.y + height, box.y], 2);
  drawAxes(canvas, { box, x: whole, y: { ...y, ticks: [] }, xLabel: 'scan' });
  const scale = `${lanesAre}, ln less median; a lane is ±${(1.25 * most).toFixed(2)}`;
  setText(canvas, scale, { x: box.x + box.width, y: TOP - 9, size: type.small, anchor: 'end', fill: grey });
}

function drawLane(canvas: Canvas, lane: GainLane, x: Scale, box: Box, most: number, k: number): void {
  const y = linearScale([-most, most], [box.y + box.height, box.y], 3);
  const zero = `M${decimal(box.x)} ${decimal(y.at(0))}h${decimal(box.width)}`;
  const edge = `M${decimal(box.x)} ${decimal(box.y)}h${decimal(box.width)}`;
  canvas.add(element('path', { d: zero, stroke: paleGrey, 'stroke-dasharray': '3 3' }));
  if (k > 0) canvas.add(element('path', { d: edge, stroke: faint }));
  const points = lane.scans.map((scan, at) => {
    const [value, sigma] = [lane.logGain[at], Math.min(most, lane.sigma[at])];
    return { x: x.at(scan), y: y.at(value), bar: [y.at(value + sigma), y.at(value - sigma)] as const };
  });
  const clipped = { 'clip-path': clipTo(canvas, `lane-${k}`, box) };
  canvas.add(element('g', clipped, markers(points, measured, 4.4)));
  const place = { x: box.x - 10, y: y.at(0), anchor: 'end', vertical: 'middle' } as const;
  const names = lane.name.split(' over ');
  names.forEach((name, line) => {
    const shift = (line - (names.length - 1) / 2) * 15;
    setText(canvas, line === 0 ? name : `/ ${name}`, {
      ...place,
      y: place.y + shift,
      size: type.small,
      fill: ink,
    });
  });
}
