/** FITS headers: blocks of 2880 bytes with 36 cards each, closed by END. Reading checks every byte of a keyword field,
 *  so data that are taken for a header end in a clear error. Source: FITS Standard 4.0, sections 3.3.1 and 4. */

import type { ByteSource } from '../../bytes.ts';
import { InputProblem } from '../../problem.ts';
import { type Card, cardLength, formatCard, type HeaderValue, isCommentary, parseCard } from './cards.ts';

export type { Card, HeaderValue } from './cards.ts';

export const blockLength = 2880;

/** More cards than any real header has (5000 blocks); stops the search for a lost END. */
const mostCards = 180_000;

/** Keywords that give the size of the data; two unlike values of one of them are refused. */
const structural = /^(SIMPLE|XTENSION|BITPIX|NAXIS\d*|PCOUNT|GCOUNT|GROUPS|TFIELDS|TFORM\d+|THEAP)$/;

/** Ordered cards, without END. `first` finds the first card of a keyword. */
export interface Header {
  /** How messages call this header. */
  readonly place: string;
  readonly cards: readonly Card[];
  readonly first: ReadonlyMap<string, Card>;
}

/** Keyword, value, comment. */
export type NewCard = readonly [keyword: string, value: HeaderValue, comment?: string];

/** A header of the given cards, in that order. */
export function makeHeader(cards: readonly NewCard[], place = 'new header'): Header {
  return headerOf(
    cards.map(([keyword, value, comment = '']) => ({ keyword, value, comment })),
    place,
  );
}

function headerOf(cards: readonly Card[], place: string): Header {
  const first = new Map<string, Card>();
  for (const card of cards) {
    const before = first.get(card.keyword);
    if (before === undefined) first.set(card.keyword, card);
    else if (structural.test(card.keyword) && before.value !== card.value) {
      throw new InputProblem({
        code: 'bad-header',
        place: placeOf(place, card),
        expected: `${card.keyword} once`,
        found: `${card.keyword} = ${before.value} and ${card.keyword} = ${card.value}`,
        advice: 'The header contradicts itself: make the file again.',
      });
    }
  }
  return { place, cards, first };
}

/** The value of a keyword; undefined when the header lacks it, null when it has no value.
 *  @throws InputProblem when what stands there is no legal value. */
export function headerValue(header: Header, keyword: string): HeaderValue | undefined {
  const card = header.first.get(keyword);
  if (card?.fault !== undefined) throw badValue(header, keyword, 'a string, a number, T or F', card.fault);
  return card?.value;
}

/** The texts of all cards with this keyword, such as HISTORY. */
export function headerTexts(header: Header, keyword: string): string[] {
  return header.cards.filter((card) => card.keyword === keyword).map((card) => String(card.value ?? ''));
}

/** A finite number. @throws InputProblem when it is absent (without `otherwise`) or no number. */
export function requireNumber(header: Header, keyword: string, otherwise?: number): number {
  const value = headerValue(header, keyword) ?? otherwise;
  if (typeof value !== 'number') throw badValue(header, keyword, 'a number', value);
  return value;
}

/** An integer from `from` to `to`. @throws InputProblem */
export function requireInteger(header: Header, keyword: string, from: number, to: number): number {
  const value = headerValue(header, keyword);
  if (!(typeof value === 'number' && Number.isInteger(value) && value >= from && value <= to)) {
    throw badValue(header, keyword, `an integer from ${from} to ${to}`, value);
  }
  return value;
}

/** A string, trailing blanks removed. @throws InputProblem when it is absent (without `otherwise`) or no string. */
export function requireText(header: Header, keyword: string, otherwise?: string): string {
  const value = headerValue(header, keyword) ?? otherwise;
  if (typeof value !== 'string') throw badValue(header, keyword, 'a string', value);
  return value;
}

/** An integer of any size, or undefined when the header lacks it. @throws InputProblem */
export function bigInteger(header: Header, keyword: string): bigint | undefined {
  const card = header.first.get(keyword);
  if (card === undefined || (card.value === null && card.fault === undefined)) return undefined;
  const digits = card.digits ?? String(card.value);
  if (!/^[+-]?\d+$/.test(digits)) throw badValue(header, keyword, 'an integer', card.fault ?? card.value);
  return BigInt(digits.replace(/^\+/, ''));
}

function badValue(header: Header, keyword: string, expected: string, found: unknown): InputProblem {
  return new InputProblem({
    code: found === undefined ? 'missing-keyword' : 'bad-value',
    place: placeOf(header.place, header.first.get(keyword)),
    expected: `${keyword} to be ${expected}`,
    found: found === undefined ? 'no such keyword' : found === null ? 'no value' : `${found}`,
    advice: 'Correct the header with the program that wrote the file.',
  });
}

function placeOf(place: string, card: Card | undefined): string {
  return card?.offset === undefined ? place : `${place}, byte ${card.offset}`;
}

/** Reads the header that starts at `offset`, block by block.
 *  @throws InputProblem when END is missing, the file ends, or a card is not ASCII. */
export function parseHeader(source: ByteSource, offset: number): { header: Header; dataOffset: number } {
  const place = `${source.name}, header at byte ${offset}`;
  const cards: Card[] = [];
  const most = offset + mostCards * cardLength;
  for (let at = offset; at < most; at += blockLength) {
    if (at + blockLength > source.size) throw noEnd(place, `the end of the file at byte ${source.size}`);
    const bytes = source.read(at, blockLength);
    const block = Buffer.from(bytes.buffer, bytes.byteOffset, bytes.length).toString('latin1');
    for (let column = 0; column < blockLength; column += cardLength) {
      const text = block.slice(column, column + cardLength);
      if (text.trimEnd() === 'END') {
        return { header: headerOf(joined(cards), place), dataOffset: at + blockLength };
      }
      cards.push(parseCard(text, at + column, source.name));
    }
  }
  throw noEnd(place, `${cards.length} cards without END`);
}

/** The cards, with what CONTINUE carries put to the string before it (section 4.2.1.2). Cost O(cards): the pieces of a
 *  string are joined once, when it ends. */
function joined(cards: readonly Card[]): Card[] {
  const result: Card[] = [];
  for (let at = 0; at < cards.length; ) {
    const pieces = [cards[at] as Card];
    while (isOpen(pieces.at(-1) as Card) && continues(cards[at + pieces.length])) {
      pieces.push(cards[at + pieces.length] as Card);
    }
    result.push(pieces.length === 1 ? (pieces[0] as Card) : joinedCard(pieces));
    at += pieces.length;
  }
  return result;
}

function isOpen({ keyword, value }: Card): boolean {
  return !isCommentary(keyword) && typeof value === 'string' && value.endsWith('&');
}

function continues(card: Card | undefined): boolean {
  return card?.keyword === 'CONTINUE' && typeof card.value === 'string';
}

function joinedCard(pieces: readonly Card[]): Card {
  const texts = pieces.map(({ value }, k) =>
    k < pieces.length - 1 ? String(value).slice(0, -1) : String(value),
  );
  const comment = pieces.map((piece) => piece.comment).join('');
  return { ...(pieces[0] as Card), value: texts.join(''), comment: comment.trim() };
}

function noEnd(place: string, found: string): InputProblem {
  return new InputProblem({
    code: 'bad-header',
    place,
    expected: 'a card END in the last of one or more blocks of 2880 bytes',
    found,
    advice: 'The file is cut short or is no FITS file: fetch it again.',
  });
}

/** The bytes of a header with END, filled with blanks to a multiple of 2880. */
export function formatHeader(header: Header): Uint8Array<ArrayBuffer> {
  const texts = header.cards.flatMap((card) => formatCard(card.keyword, card.value, card.comment));
  const text = [...texts, 'END'.padEnd(cardLength)].join('');
  const length = Math.ceil(text.length / blockLength) * blockLength;
  const bytes = new Uint8Array(length).fill(0x20);
  for (let i = 0; i < text.length; i++) bytes[i] = text.charCodeAt(i);
  return bytes;
}
