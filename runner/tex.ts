/** Words, names and units in LaTeX. Everything written here compiles in any document without a package. */

const DIGITS = ['Zero', 'One', 'Two', 'Three', 'Four', 'Five', 'Six', 'Seven', 'Eight', 'Nine'];

/** Capitalised commands of LaTeX and its AMS packages that a published number's name could give (common practice). */
const TAKEN = new Set(
  (
    'AA AE Alph Big Bigg Bigl Bigr Box Cap Cup Delta Diamond Downarrow Finv Game Gamma H Huge Im Join L LARGE Lambda ' +
    'Large Leftarrow Longleftarrow Lsh O OE Omega P Phi Pi Pr Psi Re Rightarrow Roman Rsh S Sigma Subset Supset TeX ' +
    'Theta Uparrow Upsilon Vert Xi LaTeX'
  ).split(' '),
);

/** Returns a macro name for each published name, letters only: words joined with capitals, digits spelled out,
 *  accents dropped. A name that LaTeX has already, or that stands before, gets `Value`, then `ValueB`, `ValueC` … */
export function texMacroNames(names: readonly string[]): string[] {
  const given = new Set<string>();
  return names.map((name) => {
    const plain = macroName(name);
    let candidate = plain;
    for (let k = 0; given.has(candidate) || TAKEN.has(candidate); k++) {
      candidate = `${plain}Value${k === 0 ? '' : letters(k)}`;
    }
    given.add(candidate);
    return candidate;
  });
}

/** Returns text that may follow a percent sign: one line of printable ASCII. */
export function texComment(text: string): string {
  return text.replace(/[^\u0020-\u007e]+/g, '?');
}

/** Returns a unit for mathematics: `uas` as `\mathrm{\mu as}`, `Jy pixel-1` as `\mathrm{Jy}\,\mathrm{pixel}^{-1}`,
 *  `deg` as a degree sign; the empty unit as nothing. Units are written as VOUnits writes them: factors separated by
 *  a dot or a blank, `/`, powers as `**2`, `^2` or a number behind. What cannot be read is set as it stands, escaped. */
export function texUnit(unit: string): string {
  const parts = unit.trim().split(/([.\s/]+)/);
  let written = '';
  for (const part of parts) {
    if (part === '') continue;
    if (/^[.\s]+$/.test(part)) written += '\\,';
    else if (part.includes('/')) written += '/';
    else written += texFactor(part);
  }
  return written;
}

function texFactor(factor: string): string {
  if (factor === 'deg') return '{}^{\\circ}';
  if (factor === '%') return '\\%';
  const [, symbol = '', power = ''] = /^([A-Za-zµ]+)(?:\*\*|\^)?\(?([+-]?\d+)?\)?$/.exec(factor) ?? [];
  if (symbol === '') return `\\mathrm{${escapeTex(factor)}}`;
  const micro = /^[uµ](as|arcsec|Jy|rad|m|s|g|K|Hz|W|V)$/.exec(symbol);
  const name = micro === null ? escapeTex(symbol) : `\\mu ${micro[1]}`;
  return `\\mathrm{${name}}${power === '' ? '' : `^{${power}}`}`;
}

function escapeTex(text: string): string {
  return text
    .replace(/µ/g, 'u')
    .replace(/[^\u0020-\u007e]+/g, '?')
    .replace(/[#$%&_{}]/g, '\\$&')
    .replace(/[\\^~](?![#$%&_{}])/g, '?');
}

function macroName(name: string): string {
  const ascii = name
    .replaceAll('ß', 'ss')
    .normalize('NFKD')
    .replace(/[\u0300-\u036f]/g, '');
  const words = ascii.match(/[A-Za-z]+|\d/g) ?? [];
  const joined = words.map((word) => (/\d/.test(word) ? DIGITS[Number(word)] : capitalised(word))).join('');
  return joined === '' ? 'Number' : joined;
}

function capitalised(word: string): string {
  return `${word.slice(0, 1).toUpperCase()}${word.slice(1)}`;
}

/** 1 is B, 2 is C, … 25 is Z, 26 is BA. */
function letters(k: number): string {
  const rest = Math.floor(k / 26);
  return `${rest === 0 ? '' : letters(rest)}${String.fromCharCode(65 + (k % 26))}`;
}
