/** Stamping: a figure becomes a plate. The plate number is set small in the empty strip at the lower right edge, a
 *  mark at the lower left, both as outlines; SVG metadata and PNG text carry the number too. The same figure and words
 *  give the same bytes.
 *
 *  Metadata of the SVG is RDF/XML with the Dublin Core terms identifier, title, source and description
 *  (DCMI Metadata Terms, section 3; SVG 1.1, section 21). PNG keywords are those of the PNG specification, section
 *  11.3.3.1 (Title, Description, Software, Warning), and `Plate`. */

import { warning } from '../../stages/formats/drawing/style.ts';
import { decimal, element, escapeXml, PLATE_STRIP } from '../../stages/formats/drawing/svg.ts';
import { textPath, textWidth } from '../../stages/formats/drawing/text.ts';
import { InputProblem } from '../../stages/problem.ts';
import { addPngText } from './png-text.ts';
import { renderPng } from './render-png.ts';

export interface Stamp {
  /** Such as `57b-K3Q9M2`. */
  readonly plate: string;
  readonly title: string;
  /** The recipe's name. */
  readonly recipe: string;
  /** What a reader must know, such as a check out of limits. */
  readonly mark?: string | null;
}

const NUMBER_SIZE = 9.5;
const NUMBER_COLOUR = '#5d6166';
const MARK_SIZES = [11, 10, 9, 8];
const MARGIN = 12;
const RDF = 'http://www.w3.org/1999/02/22-rdf-syntax-ns#';
const DC = 'http://purl.org/dc/terms/';

/** Returns the stamped figure as SVG and as PNG with two pixels a px.
 *  @throws InputProblem when the bytes are no SVG figure of ours, or already a plate. */
export async function stampFigure(
  figure: Uint8Array,
  stamp: Stamp,
): Promise<{ svg: Uint8Array; png: Uint8Array }> {
  const text = Buffer.from(figure).toString('utf8');
  const { rootEnd, width, height } = measureFigure(text);
  const close = text.lastIndexOf('</svg>');
  const stamped = [
    text.slice(0, rootEnd),
    `\n${metadata(stamp)}`,
    text.slice(rootEnd, close),
    `${plateMark(stamp, width, height)}\n`,
    text.slice(close),
  ].join('');
  const png = addPngText(await renderPng(stamped), pngTexts(stamp));
  return { svg: Buffer.from(stamped, 'utf8'), png };
}

/** Where the root's start tag ends, and the figure's size in px. */
function measureFigure(text: string): { rootEnd: number; width: number; height: number } {
  const root = /<svg\b[^>]*>/.exec(text);
  const size = (name: string) => Number(new RegExp(`\\s${name}="([0-9.]+)"`).exec(root?.[0] ?? '')?.[1]);
  const [width, height] = [size('width'), size('height')];
  if (root === null || !(width > 0 && height > PLATE_STRIP) || !text.includes('</svg>')) {
    throw new InputProblem({
      code: 'not-figure',
      place: 'figure, root element',
      expected: `an SVG document with width and height in px, higher than the plate strip of ${PLATE_STRIP}`,
      found: root?.[0] ?? `text that begins with ${JSON.stringify(text.slice(0, 40))}`,
      advice: 'Publish an output of format svg.',
    });
  }
  const plate = /<dcterms:identifier>([^<]*)</.exec(text)?.[1];
  if (plate !== undefined) {
    throw new InputProblem({
      code: 'already-plate',
      place: 'figure, metadata',
      expected: 'a figure without plate number',
      found: `plate ${plate}`,
      advice: 'Stamp the figure as its stage drew it.',
    });
  }
  return { rootEnd: root.index + root[0].length, width, height };
}

function metadata(stamp: Stamp): string {
  const fields = [
    element('dcterms:identifier', {}, escapeXml(stamp.plate)),
    element('dcterms:title', {}, escapeXml(stamp.title)),
    element('dcterms:source', {}, escapeXml(`recipe ${stamp.recipe}`)),
  ];
  if (hasMark(stamp)) fields.push(element('dcterms:description', {}, escapeXml(stamp.mark)));
  // An empty rdf:about makes these statements about the document itself.
  const description = element('rdf:Description', { 'rdf:about': '' }, fields);
  const rdf = element('rdf:RDF', { 'xmlns:rdf': RDF, 'xmlns:dcterms': DC }, description);
  return element('metadata', {}, rdf);
}

function plateMark(stamp: Stamp, width: number, height: number): string {
  const baseline = height - 8;
  const label = `Plate ${stamp.plate}`;
  const x = width - MARGIN - textWidth(label, NUMBER_SIZE);
  const number = outlined(label, textPath(label, x, baseline, NUMBER_SIZE), NUMBER_COLOUR);
  if (!hasMark(stamp)) return element('g', { id: 'plate' }, number);
  const { text, size } = fitMark(stamp.mark, x - 3 * MARGIN - 14);
  const warningSign = element('path', { d: triangle(MARGIN, baseline), fill: warning });
  const words = outlined(stamp.mark, textPath(text, MARGIN + 16, baseline, size), warning);
  return element('g', { id: 'plate' }, [warningSign, words, number]);
}

function hasMark(stamp: Stamp): stamp is Stamp & { mark: string } {
  return typeof stamp.mark === 'string' && stamp.mark !== '';
}

function outlined(label: string, path: string, fill: string): string {
  return element('path', { role: 'img', 'aria-label': label, d: path, fill });
}

/** A small upright triangle with a gap for the stroke of an exclamation mark. */
function triangle(x: number, baseline: number): string {
  const outer = `M${decimal(x)} ${decimal(baseline + 1)}h12l-6 -11Z`;
  return `${outer}M${decimal(x + 5.3)} ${decimal(baseline - 6)}v3.8h1.4v-3.8ZM${decimal(x + 5.3)} ${decimal(baseline - 1.2)}v1.2h1.4v-1.2Z`;
}

/** The mark's words at the largest size that fits; shortened with an ellipsis when none does. */
function fitMark(mark: string, room: number): { text: string; size: number } {
  const words = mark.replace(/\s+/g, ' ').replaceAll('*', '');
  const size = MARK_SIZES.find((each) => textWidth(words, each) <= room);
  if (size !== undefined) return { text: words, size };
  const smallest = MARK_SIZES.at(-1) as number;
  const characters = [...words];
  while (characters.length > 0 && textWidth(`${characters.join('')}…`, smallest) > room) characters.pop();
  return { text: `${characters.join('').trimEnd()}…`, size: smallest };
}

function pngTexts(stamp: Stamp): Record<string, string> {
  const words = (text: string) => text.replace(/\s+/g, ' ');
  return {
    Title: words(stamp.title),
    Description: words(`Figure of the recipe ${stamp.recipe}.`),
    Software: 'Platebook',
    ...(hasMark(stamp) ? { Warning: words(stamp.mark) } : {}),
    Plate: stamp.plate,
  };
}
