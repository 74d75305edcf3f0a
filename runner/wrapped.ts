/** Text for the terminal. */

/** Text broken at spaces to lines of at most `columns`, every line indented, those after the first by `hanging` more. */
export function wrapped(text: string, columns: number, indent: number, hanging = 0): string {
  const margin = ' '.repeat(indent);
  const lines: string[] = [];
  let line = '';
  for (const word of text.split(/\s+/)) {
    if (line !== '' && indent + line.length + 1 + word.length > columns) {
      lines.push(line);
      line = ' '.repeat(hanging);
    }
    line += line.trim() === '' ? word : ` ${word}`;
  }
  return [...lines, line].map((each) => margin + each).join('\n');
}
