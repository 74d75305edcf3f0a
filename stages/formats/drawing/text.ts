/** Text set as outlines, so that a picture looks the same on every machine. Every glyph is defined once and reused;
 *  the words stay findable as the group's `aria-label`. Characters between asterisks are set oblique: `*u*`. */

import { CAP_HEIGHT, type FontStyle, kerningOf, type Outline, outlineOf, UNITS_PER_EM } from './font.ts';
import { type Canvas, decimal, element } from './svg.ts';

export interface TextOptions {
  readonly x: number;
  readonly y: number;
  /** px per em, default 13. */
  readonly size?: number;
  readonly anchor?: 'start' | 'middle' | 'end';
  /** Whether y is the baseline or the middle of the capitals; default baseline. */
  readonly vertical?: 'baseline' | 'middle';
  readonly fill?: string;
  /** Degrees, clockwise as SVG turns. */
  readonly rotate?: number;
  /** A halo in this colour behind the glyphs, for text on a picture. */
  readonly halo?: string;
}

interface PlacedGlyph {
  readonly character: string;
  readonly style: FontStyle;
  readonly outline: Outline;
  /** Font units from the beginning of the text. */
  readonly x: number;
}

const DEFAULT_SIZE = 13;

/** Sets a line of text on the canvas. */
export function setText(canvas: Canvas, text: string, options: TextOptions): void {
  const { glyphs, advance } = placeGlyphs(text);
  const { size = DEFAULT_SIZE, fill = '#1f2328' } = options;
  const scale = size / UNITS_PER_EM;
  const start = { start: 0, middle: -advance / 2, end: -advance }[options.anchor ?? 'start'];
  const drop = options.vertical === 'middle' ? (CAP_HEIGHT * UNITS_PER_EM) / 2 : 0;
  const uses: string[] = [];
  for (const { character, style, outline, x } of glyphs) {
    if (outline.path === '') continue;
    const id = `${style === 'upright' ? 'u' : 'o'}${(character.codePointAt(0) ?? 0).toString(16)}`;
    canvas.define(id, element('path', { id, d: outline.path }));
    uses.push(
      element('use', { href: `#${id}`, x: Math.round(start + x), y: drop === 0 ? undefined : -drop }),
    );
  }
  const turn = options.rotate === undefined ? '' : ` rotate(${decimal(options.rotate)})`;
  const transform = `translate(${decimal(options.x)} ${decimal(options.y)})${turn} scale(${decimal(scale, 6)} ${decimal(-scale, 6)})`;
  const group = { role: 'img', 'aria-label': plainText(text), transform, fill };
  const halo = options.halo === undefined ? {} : haloAttributes(options.halo, scale);
  canvas.add(element('g', { ...group, ...halo }, uses.join('')));
}

/** Returns the width of a line of text in px. */
export function textWidth(text: string, size = DEFAULT_SIZE): number {
  return (placeGlyphs(text).advance * size) / UNITS_PER_EM;
}

/** Returns a line of text as one path's data in px, beginning at (x, y) on the baseline. For marks that are set on a
 *  finished picture, without definitions. */
export function textPath(text: string, x: number, y: number, size: number): string {
  const scale = size / UNITS_PER_EM;
  let data = '';
  for (const glyph of placeGlyphs(text).glyphs) {
    data += glyph.outline.path.replace(/(-?[\d.]+) (-?[\d.]+)/g, (_, px: string, py: string) => {
      return `${decimal(x + (glyph.x + Number(px)) * scale)} ${decimal(y - Number(py) * scale)}`;
    });
  }
  return data;
}

/** Returns the text without the asterisks that switch the style. */
export function plainText(text: string): string {
  return text.replaceAll('*', '');
}

function placeGlyphs(text: string): { glyphs: PlacedGlyph[]; advance: number } {
  const glyphs: PlacedGlyph[] = [];
  let style: FontStyle = 'upright';
  let advance = 0;
  let before: PlacedGlyph | undefined;
  for (const character of text) {
    if (character === '*') {
      style = style === 'upright' ? 'oblique' : 'upright';
      continue;
    }
    const outline = outlineOf(character, style);
    if (before !== undefined && before.style === style) advance += kerningOf(before.outline, outline, style);
    before = { character, style, outline, x: advance };
    glyphs.push(before);
    advance += outline.advance;
  }
  return { glyphs, advance };
}

function haloAttributes(colour: string, scale: number) {
  return {
    stroke: colour,
    'stroke-width': Math.round(3 / scale),
    'stroke-linejoin': 'round',
    'paint-order': 'stroke',
  };
}
