/** The bytes of a recipe, or of one `--let`, as text in which every offset has a line and a column. */

import { LineCounter } from 'yaml';

export interface SourceText {
  /** How messages name it: the path as given, or the whole `--let`. */
  readonly file: string;
  readonly text: string;
  /** Null where lines and columns would say nothing: a `--let`. */
  readonly lines: LineCounter | null;
  /** Problems are reported in this order: the recipe 0, then each `--let`. */
  readonly order: number;
}

/** A place in a text. */
export interface Spot {
  readonly source: SourceText;
  readonly offset: number;
}

/** A text whose lines are counted. */
export function sourceText(file: string, text: string): SourceText {
  const lines = new LineCounter();
  lines.addNewLine(0);
  for (let at = text.indexOf('\n'); at >= 0; at = text.indexOf('\n', at + 1)) lines.addNewLine(at + 1);
  return { file, text, lines, order: 0 };
}

/** Line and column from 1 (column in UTF-16 units), and the line itself. */
export function placeOf(spot: Spot): { line: number; column: number; sourceLine: string } | null {
  const { text, lines } = spot.source;
  if (lines === null) return null;
  const { line, col } = lines.linePos(spot.offset);
  const start = lines.lineStarts[line - 1];
  const end = text.indexOf('\n', start);
  return { line, column: col, sourceLine: text.slice(start, end < 0 ? undefined : end).replace(/\r$/, '') };
}

/** Decodes UTF-8, without a byte order mark; the offset of the first byte that is no UTF-8 otherwise. */
export function decodeUtf8(bytes: Uint8Array): string | { readonly badByte: number } {
  try {
    return new TextDecoder('utf-8', { fatal: true }).decode(bytes);
  } catch {
    return { badByte: firstBadByte(bytes) };
  }
}

/** Bisection over the prefixes that decode, where a character cut in two at the end is no fault; the first bad
 *  sequence begins after the last whole character of the longest. */
function firstBadByte(bytes: Uint8Array): number {
  let [good, bad] = [0, bytes.length + 1];
  while (bad - good > 1) {
    const middle = (good + bad) >> 1;
    if (wholeCharacters(bytes.subarray(0, middle)) !== undefined) good = middle;
    else bad = middle;
  }
  return new TextEncoder().encode(wholeCharacters(bytes.subarray(0, good))).length;
}

function wholeCharacters(prefix: Uint8Array): string | undefined {
  try {
    return new TextDecoder('utf-8', { fatal: true, ignoreBOM: true }).decode(prefix, { stream: true });
  } catch {
    return undefined;
  }
}
