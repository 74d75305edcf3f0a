/** One card of a FITS header: 80 ASCII characters `KEYWORD = value / comment`, fixed or free format.
 *  Source: FITS Standard 4.0, sections 4.1 and 4.2; long strings by CONTINUE, section 4.2.1.2. */

import { InputProblem, InternalError } from '../../problem.ts';

/** A string, a number, a logical; null for a keyword without a value. */
export type HeaderValue = string | number | boolean | null;

export interface Card {
  readonly keyword: string;
  /** The text of a COMMENT, HISTORY or blank card; null also when `fault` is set. */
  readonly value: HeaderValue;
  readonly comment: string;
  /** Byte in the file, for messages. */
  readonly offset?: number;
  /** The number as it stands, so that integers beyond 2^53 are not lost. */
  readonly digits?: string;
  /** What stands there when it is no legal value; told when the keyword is asked for. */
  readonly fault?: string;
}

export const cardLength = 80;
const valueColumn = 10;
const longestPiece = 67;
const commentary = new Set(['COMMENT', 'HISTORY', '']);
const numberPattern = /^[+-]?(\d+\.?\d*|\.\d+)([ED][+-]?\d+)?$/;

/** Reads one card. A value that is no legal FITS value is kept as `fault`.
 *  @throws InputProblem when the keyword field holds anything but printable ASCII: this is no header. */
export function parseCard(text: string, offset: number, place: string): Card {
  const keyword = text.slice(0, 8).trimEnd();
  if (!isAscii(keyword)) {
    throw new InputProblem({
      code: 'bad-header',
      place: `${place}, byte ${offset}`,
      expected: 'a header card that begins with a keyword in ASCII, or END',
      found: JSON.stringify(text.slice(0, 8)),
      advice: 'The header has lost its END or the file is no FITS file.',
    });
  }
  if (keyword === 'HIERARCH') return parseHierarch(text, offset);
  if (keyword === 'CONTINUE') return { keyword, offset, ...parseValue(text.slice(8)) };
  if (commentary.has(keyword) || text.slice(8, valueColumn) !== '= ') {
    return { keyword, value: text.slice(8).trimEnd(), comment: '', offset };
  }
  return { keyword, offset, ...parseValue(text.slice(valueColumn)) };
}

/** Whether the card carries text instead of a value. */
export function isCommentary(keyword: string): boolean {
  return commentary.has(keyword);
}

function parseHierarch(text: string, offset: number): Card {
  const equals = text.indexOf('=');
  if (equals < 0) return { keyword: 'HIERARCH', value: text.slice(8).trimEnd(), comment: '', offset };
  const keyword = text.slice(0, equals).trim().replace(/ +/g, ' ').toUpperCase();
  return { keyword, offset, ...parseValue(text.slice(equals + 1)) };
}

type Value = Pick<Card, 'value' | 'comment' | 'digits' | 'fault'>;

function parseValue(field: string): Value {
  const start = field.search(/[^ ]/);
  if (start < 0) return { value: null, comment: '' };
  if (field[start] === "'") return parseString(field, start);
  const slash = field.indexOf('/', start);
  const token = (slash < 0 ? field.slice(start) : field.slice(start, slash)).trimEnd();
  const comment = slash < 0 ? '' : field.slice(slash + 1).trim();
  if (token === '') return { value: null, comment };
  if (token === 'T' || token === 'F') return { value: token === 'T', comment };
  if (numberPattern.test(token)) {
    const number = Number(token.replace('D', 'E'));
    if (Number.isFinite(number)) return { value: number, comment, digits: token };
  }
  return { value: null, comment, fault: token };
}

function parseString(field: string, start: number): Value {
  let end = start + 1;
  for (;;) {
    end = field.indexOf("'", end);
    if (end < 0) return { value: null, comment: '', fault: field.slice(start).trimEnd() };
    if (field[end + 1] !== "'") break;
    end += 2;
  }
  const value = field
    .slice(start + 1, end)
    .replaceAll("''", "'")
    .trimEnd();
  if (!isAscii(value)) return { value: null, comment: '', fault: JSON.stringify(value) };
  const comment = field.slice(end + 1).trim();
  return { value, comment: comment.startsWith('/') ? comment.slice(1).trim() : '' };
}

/** The cards, each of 80 characters, that hold one keyword: several for long strings and long commentary.
 *  @throws InputProblem when a text is not printable ASCII, which no FITS header can hold. */
export function formatCard(keyword: string, value: HeaderValue, comment = ''): string[] {
  if (!/^[A-Z0-9_-]{0,8}$/.test(keyword)) throw new InternalError('formatCard', `keyword ${keyword}`);
  if (typeof value === 'string') requireAscii(value, keyword);
  requireAscii(comment, keyword);
  if (isCommentary(keyword)) return formatCommentary(keyword, String(value ?? ''));
  const head = `${keyword.padEnd(8)}= `;
  if (typeof value === 'string') return formatText(head, value, comment);
  if (value === null) return [withComment(head.padEnd(30), comment)];
  const shown = typeof value === 'boolean' ? (value ? 'T' : 'F') : formatNumber(value, keyword);
  return [withComment(head + shown.padStart(20), comment)];
}

function formatNumber(value: number, keyword: string): string {
  if (!Number.isFinite(value)) throw new InternalError('formatCard', `${keyword} = ${value}`);
  if (Object.is(value, -0)) return '-0.0';
  // Integers beyond 2^53 are written as reals: a reader's integers may be of 64 bits only.
  const plain = Number.isInteger(value) && !Number.isSafeInteger(value);
  return (plain ? value.toExponential() : String(value)).toUpperCase();
}

function formatText(head: string, value: string, comment: string): string[] {
  const quoted = value.replaceAll("'", "''");
  if (quoted.length <= longestPiece + 1) {
    // Fixed format pads to eight characters, section 4.2.1.1.
    return [withComment(`${head}'${quoted.padEnd(8)}'`.padEnd(30), comment)];
  }
  const pieces: string[] = [];
  for (let from = 0; from < quoted.length; ) {
    let to = Math.min(quoted.length, from + longestPiece);
    // A doubled quote must not be parted; an odd run of quotes at the end means that it was.
    const run = /'*$/.exec(quoted.slice(from, to))?.[0].length ?? 0;
    if (to < quoted.length && run % 2 === 1) to -= 1;
    pieces.push(quoted.slice(from, to));
    from = to;
  }
  return pieces.map((piece, i) => {
    const more = i < pieces.length - 1 ? '&' : '';
    return withComment(`${i === 0 ? head : 'CONTINUE  '}'${piece}${more}'`, '');
  });
}

function formatCommentary(keyword: string, text: string): string[] {
  const cards: string[] = [];
  for (let from = 0; from === 0 || from < text.length; from += 72) {
    cards.push((keyword.padEnd(8) + text.slice(from, from + 72)).padEnd(cardLength));
  }
  return cards;
}

function withComment(text: string, comment: string): string {
  const whole = comment === '' ? text : `${text} / ${comment}`;
  return whole.slice(0, cardLength).padEnd(cardLength);
}

function requireAscii(text: string, keyword: string): void {
  if (isAscii(text)) return;
  throw new InputProblem({
    code: 'not-ascii',
    place: `FITS keyword ${keyword}`,
    expected: 'printable ASCII characters, the only ones that a FITS header can hold',
    found: JSON.stringify(text),
    advice: 'Write the text without accents, Greek letters and control characters.',
  });
}

/** Whether all characters are printable ASCII. */
export function isAscii(text: string): boolean {
  return /^[ -~]*$/.test(text);
}
