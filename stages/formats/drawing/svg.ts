/** SVG markup: elements, numbers, and a canvas that collects a drawing. Numbers are written with fixed decimals and
 *  no locale; identifiers come from the drawing's own name, so the same drawing gives the same bytes. */

import { InternalError } from '../../problem.ts';
import { FONT_NAME } from './font.ts';

/** Height in px of the strip below every drawing that stays empty for the plate number (CONVENTIONS). */
export const PLATE_STRIP = 24;

export type Attributes = Readonly<Record<string, string | number | undefined>>;

export interface Canvas {
  /** Prefix of the drawing's own identifiers. */
  readonly name: string;
  readonly width: number;
  /** Without the strip for the plate number. */
  readonly height: number;
  add(...fragments: readonly string[]): void;
  /** Puts markup into `defs` once; a second definition of the same id is ignored. */
  define(id: string, markup: string): void;
  /** Returns the document. */
  finish(): string;
}

/** Returns an empty white canvas of `width` times `height` px, to which the plate strip is added below.
 *  @param name     kebab-case, prefix of identifiers
 *  @param title    becomes the document's title, `description` what it shows in one or two sentences */
export function startCanvas(frame: {
  readonly name: string;
  readonly width: number;
  readonly height: number;
  readonly title: string;
  readonly description: string;
}): Canvas {
  const definitions = new Map<string, string>();
  const body: string[] = [];
  const { name, width, height } = frame;
  return {
    name,
    width,
    height,
    add: (...fragments) => void body.push(...fragments),
    define: (id, markup) => void (definitions.has(id) || definitions.set(id, markup)),
    finish() {
      const total = height + PLATE_STRIP;
      const root = {
        xmlns: 'http://www.w3.org/2000/svg',
        width,
        height: total,
        viewBox: `0 0 ${decimal(width)} ${decimal(total)}`,
        role: 'img',
        'aria-labelledby': `${name}-title ${name}-description`,
      };
      const ids = [...definitions.keys()].sort();
      const lines = [
        element('title', { id: `${name}-title` }, escapeXml(frame.title)),
        element('desc', { id: `${name}-description` }, escapeXml(frame.description)),
        element('defs', {}, ids.map((id) => definitions.get(id)).join('\n')),
        element('rect', { width, height: total, fill: '#ffffff' }),
        ...body,
      ];
      const comment = `<!-- Text is set as outlines of ${FONT_NAME}. -->`;
      return `<?xml version="1.0" encoding="UTF-8"?>\n${comment}\n${element('svg', root, `\n${lines.join('\n')}\n`)}\n`;
    },
  };
}

/** Returns one element. Attributes that are undefined are left out; numbers are written by `decimal`. */
export function element(
  name: string,
  attributes: Attributes,
  children: string | readonly string[] = '',
): string {
  let tag = `<${name}`;
  for (const [key, value] of Object.entries(attributes)) {
    if (value === undefined) continue;
    tag += ` ${key}="${typeof value === 'number' ? decimal(value) : escapeXml(value)}"`;
  }
  const content = typeof children === 'string' ? children : children.join('\n');
  return content === '' ? `${tag}/>` : `${tag}>${content}</${name}>`;
}

/** Returns `value` with at most `places` decimals, without trailing zeros and without negative zero.
 *  @throws InternalError when it is not finite: no NaN is ever drawn. */
export function decimal(value: number, places = 2): string {
  if (!Number.isFinite(value)) throw new InternalError('decimal', `${value} cannot be drawn`);
  const text = value.toFixed(places);
  const short = text.includes('.') ? text.replace(/\.?0+$/, '') : text;
  return short === '-0' ? '0' : short;
}

/** Returns text that may stand in an element or in a quoted attribute. Control characters, which XML 1.0 does not
 *  admit, become spaces. */
export function escapeXml(text: string): string {
  return (
    text
      // biome-ignore lint/suspicious/noControlCharactersInRegex: these are what must not stand in the document
      .replace(/[\u0000-\u001f\u007f\ufffe\uffff]/g, ' ')
      .replace(/&/g, '&amp;')
      .replace(/</g, '&lt;')
      .replace(/>/g, '&gt;')
      .replace(/"/g, '&quot;')
  );
}
