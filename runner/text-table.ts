/** Plain text for people: aligned columns, wrapped lines, counts and sizes. No locale, no colours. */

/** A blank at which no line is broken, such as before a unit; printed as a plain one. */
export const NO_BREAK = '\u00a0';

export interface Column {
  /** Numbers go to the right. Default: left. */
  readonly right?: true;
}

/** Lines of aligned columns, two spaces apart, without trailing blanks. @param indent  blanks before each line */
export function alignRows(
  rows: readonly (readonly string[])[],
  columns: readonly Column[] = [],
  indent = 2,
): string[] {
  const count = Math.max(0, ...rows.map((row) => row.length));
  const widths = Array.from({ length: count }, (_, i) =>
    Math.max(...rows.map((row) => widthOf(row[i] ?? ''))),
  );
  const cell = (row: readonly string[], i: number) => {
    const blanks = ' '.repeat((widths[i] ?? 0) - widthOf(row[i] ?? ''));
    return columns[i]?.right ? blanks + (row[i] ?? '') : (row[i] ?? '') + blanks;
  };
  return rows.map((row) =>
    (' '.repeat(indent) + widths.map((_, i) => cell(row, i)).join('  ')).replaceAll(NO_BREAK, ' ').trimEnd(),
  );
}

/** A text in lines of at most `width` columns, broken at blanks; a longer word stands alone, whole. */
export function wrapText(text: string, width: number): string[] {
  const lines: string[] = [];
  let line = '';
  for (const word of text.split(/[ \n\t]+/)) {
    if (line !== '' && widthOf(line) + 1 + widthOf(word) > width) {
      lines.push(line);
      line = word;
    } else line = line === '' ? word : `${line} ${word}`;
  }
  lines.push(line);
  return lines.map((each) => each.replaceAll(NO_BREAK, ' '));
}

/** A name, then a text that is wrapped beside it; below it when the name is longer than its column. */
export function labelled(
  label: string,
  text: string,
  labelWidth: number,
  indent: number,
  width: number,
): string[] {
  const blank = ' '.repeat(indent + labelWidth + 2);
  const first = `${' '.repeat(indent)}${label.padEnd(labelWidth)}  `;
  const lines = wrapText(text, Math.max(20, width - blank.length));
  if (widthOf(label) > labelWidth) {
    return [' '.repeat(indent) + label, ...lines.map((line) => `${blank}${line}`)];
  }
  return lines.map((line, i) => `${i === 0 ? first : blank}${line}`.trimEnd());
}

/** `12,345`. */
export function thousands(count: number): string {
  return String(count).replace(/\B(?=(\d{3})+(?!\d))/g, ',');
}

/** `1 entry`, `12,345 entries`. */
export function counted(count: number, one: string, many: string): string {
  return `${thousands(count)} ${count === 1 ? one : many}`;
}

/** `812 bytes`, `1.2 MB`: powers of ten, two digits at least. */
export function roundSize(bytes: number): string {
  const units = ['bytes', 'kB', 'MB', 'GB', 'TB'];
  let value = bytes;
  let unit = 0;
  while (value >= 999.5 && unit < units.length - 1) {
    value /= 1000;
    unit += 1;
  }
  return `${unit === 0 || value >= 10 ? value.toFixed(0) : value.toFixed(1)} ${units[unit]}`;
}

/** `2026-01-02 03:04:05`, of an entry's time in UTC. */
export function readableTime(time: string): string {
  return time.slice(0, 19).replace('T', ' ');
}

/** Columns of a text on a terminal, for the characters that we print: one each, none for combining marks. */
function widthOf(text: string): number {
  return [...text.replace(/\p{M}/gu, '')].length;
}
