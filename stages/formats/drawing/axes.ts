/** The frame of a diagram: box, ticks, labels, and marks inside it. */

import type { Scale } from './scale.ts';
import { faint, grey, ink, type } from './style.ts';
import { type Canvas, decimal, element } from './svg.ts';
import { setText, textWidth } from './text.ts';

export interface Box {
  readonly x: number;
  readonly y: number;
  readonly width: number;
  readonly height: number;
}

export interface AxesOptions {
  readonly box: Box;
  readonly x: Scale;
  readonly y: Scale;
  /** With the unit in brackets; an absent label draws ticks without numbers. */
  readonly xLabel?: string;
  readonly yLabel?: string;
  /** px from the box to the middle of the y label; by default as the widest tick label asks. Diagrams above each
   *  other give the same. */
  readonly yLabelAt?: number;
  /** Horizontal and vertical rules through the labelled ticks. */
  readonly rules?: boolean;
}

const TICK = 5;

/** Draws the frame with ticks and labels. Draw the contents afterwards, or before with `rules` off. */
export function drawAxes(canvas: Canvas, options: AxesOptions): void {
  const { box, x, y } = options;
  if (options.rules === true) canvas.add(rules(box, x, y));
  let marks = '';
  for (const tick of x.ticks) {
    const length = tick.label === '' ? TICK / 2 : TICK;
    marks += `M${decimal(x.at(tick.value))} ${decimal(box.y + box.height)}v${decimal(length)}`;
  }
  for (const tick of y.ticks) {
    const length = tick.label === '' ? TICK / 2 : TICK;
    marks += `M${decimal(box.x)} ${decimal(y.at(tick.value))}h${decimal(-length)}`;
  }
  canvas.add(
    element('path', { d: marks, stroke: ink, 'stroke-width': 1, fill: 'none' }),
    element('rect', { ...box, fill: 'none', stroke: ink, 'stroke-width': 1 }),
  );
  if (options.xLabel !== undefined) labelX(canvas, box, x, options.xLabel);
  if (options.yLabel !== undefined) labelY(canvas, box, y, options.yLabel, options.yLabelAt);
}

/** Returns the clip attribute of a box, defining its clip path on the canvas under `name`. */
export function clipTo(canvas: Canvas, name: string, box: Box): string {
  const id = `${canvas.name}-clip-${name}`;
  canvas.define(id, element('clipPath', { id }, element('rect', { ...box })));
  return `url(#${id})`;
}

export interface Marker {
  readonly x: number;
  readonly y: number;
  /** px of the upper and the lower end of the error bar; none when absent. */
  readonly bar?: readonly [number, number];
}

/** Returns round markers, with error bars behind them, as two paths. Points are given in px.
 *  @param diameter  px */
export function markers(points: readonly Marker[], colour: string, diameter: number, opacity = 1): string {
  let bars = '';
  let dots = '';
  for (const { x, y, bar } of points) {
    if (bar !== undefined) bars += `M${decimal(x)} ${decimal(bar[0])}V${decimal(bar[1])}`;
    dots += `M${decimal(x)} ${decimal(y)}h.01`; // a short line with round ends is a dot in every renderer
  }
  const common = { fill: 'none', stroke: colour };
  const group: string[] = [];
  if (bars !== '')
    group.push(element('path', { ...common, d: bars, 'stroke-width': 0.8, opacity: 0.55 * opacity }));
  group.push(
    element('path', { ...common, d: dots, 'stroke-width': diameter, 'stroke-linecap': 'round', opacity }),
  );
  return group.join('\n');
}

/** Returns the path data of a line through points in px. */
export function polyline(points: readonly (readonly [number, number])[]): string {
  return points.map(([x, y], k) => `${k === 0 ? 'M' : 'L'}${decimal(x)} ${decimal(y)}`).join('');
}

/** Draws legend entries in a row, each with a sample of its mark; returns the x where the row ends. */
export function drawLegend(
  canvas: Canvas,
  x: number,
  y: number,
  entries: readonly {
    readonly text: string;
    readonly colour: string;
    readonly mark: 'dot' | 'line' | 'dash' | 'band';
  }[],
): number {
  let at = x;
  for (const { text, colour, mark } of entries) {
    canvas.add(legendMark(mark, colour, at, y - 4.5));
    setText(canvas, text, { x: at + 26, y, size: type.small, fill: ink });
    at += 26 + textWidth(text, type.small) + 18;
  }
  return at - 18;
}

function legendMark(mark: 'dot' | 'line' | 'dash' | 'band', colour: string, x: number, y: number): string {
  if (mark === 'dot') return markers([{ x: x + 10, y }], colour, 6);
  if (mark === 'band') return element('rect', { x, y: y - 5, width: 20, height: 10, fill: colour });
  const dash = mark === 'dash' ? '5 3' : undefined;
  return element('path', {
    d: `M${decimal(x)} ${decimal(y)}h20`,
    stroke: colour,
    'stroke-width': 2,
    'stroke-dasharray': dash,
  });
}

function rules(box: Box, x: Scale, y: Scale): string {
  let d = '';
  for (const tick of x.ticks)
    if (tick.label !== '') d += `M${decimal(x.at(tick.value))} ${decimal(box.y)}v${decimal(box.height)}`;
  for (const tick of y.ticks)
    if (tick.label !== '') d += `M${decimal(box.x)} ${decimal(y.at(tick.value))}h${decimal(box.width)}`;
  return element('path', { d, stroke: faint, 'stroke-width': 1, fill: 'none' });
}

function labelX(canvas: Canvas, box: Box, x: Scale, label: string): void {
  const bottom = box.y + box.height;
  for (const tick of x.ticks) {
    if (tick.label === '') continue;
    setText(canvas, tick.label, {
      x: x.at(tick.value),
      y: bottom + 20,
      size: type.tick,
      anchor: 'middle',
      fill: ink,
    });
  }
  setText(canvas, label, {
    x: box.x + box.width / 2,
    y: bottom + 42,
    size: type.label,
    anchor: 'middle',
    fill: ink,
  });
}

function labelY(canvas: Canvas, box: Box, y: Scale, label: string, at: number | undefined): void {
  let widest = 0;
  for (const tick of y.ticks) {
    if (tick.label === '') continue;
    widest = Math.max(widest, textWidth(tick.label, type.tick));
    setText(canvas, tick.label, {
      x: box.x - 9,
      y: y.at(tick.value),
      size: type.tick,
      anchor: 'end',
      vertical: 'middle',
      fill: ink,
    });
  }
  setText(canvas, label, {
    x: box.x - (at ?? widest + 18),
    y: box.y + box.height / 2,
    size: type.label,
    anchor: 'middle',
    rotate: -90,
    fill: ink,
  });
}

/** Draws the heading line of a figure between two edges in px: what is shown at the left, a remark such as "invented
 *  data" at the right. */
export function drawHeading(
  canvas: Canvas,
  edges: readonly [number, number],
  left: string,
  remark: string,
): void {
  if (left !== '') setText(canvas, left, { x: edges[0], y: 28, size: type.heading, fill: ink });
  if (remark === '') return;
  const room = edges[1] - edges[0] - textWidth(left, type.heading) - 24;
  const size = Math.min(type.small, (type.small * room) / Math.max(1, textWidth(remark, type.small)));
  setText(canvas, remark, { x: edges[1], y: 28, size: Math.max(7, size), anchor: 'end', fill: grey });
}
