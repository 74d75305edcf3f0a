/** The font of all pictures: DejaVu Sans, upright and oblique, as the package dejavu-fonts-ttf carries it. Read once
 *  per process. Glyph outlines are whole and half font units, y upwards; nothing here is computed with transcendentals
 *  (looked through opentype.js 2.0.0: `Math.log` and `Math.pow` stand only in its writers, bounding boxes and hinting,
 *  none of which runs here). */

import { readFileSync } from 'node:fs';
import { createRequire } from 'node:module';
// Imported so that the font's version is part of the code's record.
import fontPackage from 'dejavu-fonts-ttf/package.json' with { type: 'json' };
import opentype, { type Font, type Glyph } from 'opentype.js';

export type FontStyle = 'upright' | 'oblique';

export interface Outline {
  readonly advance: number;
  readonly index: number;
  /** SVG path data in font units, y upwards; empty for a space. */
  readonly path: string;
}

/** The font's name and release, for the document's comment. */
export const FONT_NAME = `DejaVu Sans ${fontPackage.version}`;
/** Font units per em of both styles. */
export const UNITS_PER_EM = 2048;
/** Height of capitals in ems: DejaVu Sans, 1493/2048. */
export const CAP_HEIGHT = 1493 / 2048;

const files = { upright: 'DejaVuSans.ttf', oblique: 'DejaVuSans-Oblique.ttf' };
const fonts = new Map<FontStyle, Font>();
const outlines = new Map<string, Outline>();

/** Returns the outline of one character (a code point). A character that the font lacks gets its empty box. */
export function outlineOf(character: string, style: FontStyle): Outline {
  const key = `${style} ${character}`;
  let outline = outlines.get(key);
  if (outline === undefined) {
    const glyph = fontOf(style).charToGlyph(character);
    outline = { advance: glyph.advanceWidth, index: glyph.index, path: pathData(glyph) };
    outlines.set(key, outline);
  }
  return outline;
}

/** Returns the correction of the distance between two glyphs of one style, font units. */
export function kerningOf(left: Outline, right: Outline, style: FontStyle): number {
  return fontOf(style).kerningPairs[`${left.index},${right.index}`] ?? 0;
}

function fontOf(style: FontStyle): Font {
  let font = fonts.get(style);
  if (font === undefined) {
    const path = createRequire(import.meta.url).resolve(`dejavu-fonts-ttf/ttf/${files[style]}`);
    const bytes = new Uint8Array(readFileSync(path));
    font = opentype.parse(bytes.buffer, { lowMemory: true });
    fonts.set(style, font);
  }
  return font;
}

function pathData(glyph: Glyph): string {
  let data = '';
  for (const { type, x, y, x1, y1 } of glyph.path.commands) {
    // TrueType outlines hold lines and quadratic curves only.
    if (type === 'Z') data += 'Z';
    else if (type === 'Q') data += `Q${x1} ${y1} ${x} ${y}`;
    else data += `${type}${x} ${y}`;
  }
  return data;
}
