import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { PublishedNumber } from '../../ledger/entry.ts';
import { formatNumbersJson, formatNumbersTex, roundedNumber } from '../../runner/numbers-files.ts';
import { texMacroNames, texUnit } from '../../runner/tex.ts';

const heading = { recipe: 'lantern-ring', run: 3 };

function published(fields: Partial<PublishedNumber>): PublishedNumber {
  const common = { output: 'ring', key: 'diameter', against: null, tolerance: null, entry: 57 };
  return {
    name: 'ring-diameter',
    value: 42.1234,
    low: 41.41,
    high: 42.95,
    unit: 'uas',
    ...common,
    ...fields,
  };
}

/** What a line of numbers.tex may be: one macro of letters, one number in mathematics with balanced braces, and a
 *  comment of printable ASCII. Every command in it is defined by LaTeX itself. */
const word = String.raw`(?:[ !"'()*+,\-./0-9:;<=>?@A-Z\[\]a-z\`|]|\\mu |\\[#$%&_{}])*`;
const factor = String.raw`(?:\\mathrm\{${word}\}(?:\^\{[+-]?\d+\})?|\{\}\^\{\\circ\}|\\%)`;
const unit = String.raw`(?:\\,(?:${factor}|\\,|/)+)?`;
const number = String.raw`(?:\{-?\d+(?:\.\d+)?\}(?:\^\{\+\d+(?:\.\d+)?\}_\{-\d+(?:\.\d+)?\})?(?:\\times 10\^\{-?\d+\})?|\\mathrm\{(?:NaN|-?Infinity)\})`;
const line = new RegExp(
  String.raw`^\\newcommand\{\\[A-Za-z]+\}\{\\ensuremath\{${number}${unit}\}\}% [\x20-\x7e]*$`,
);

describe('numbers.tex', () => {
  it('holds one macro per number, rounded by its interval', () => {
    const numbers = [
      published({}),
      published({ name: 'position-angle', value: 155.2, low: 150, high: 160.5, unit: 'deg', entry: 58 }),
      published({
        name: 'flux-2',
        value: 0.62,
        low: null,
        high: null,
        unit: 'Jy',
        output: 'flux',
        key: 'total',
      }),
    ];
    // Rounded by hand.
    expect(formatNumbersTex(numbers, heading)).toBe(
      [
        '% Published numbers of recipe lantern-ring, run 3. Intervals hold 68 %.',
        '\\newcommand{\\RingDiameter}{\\ensuremath{{42.12}^{+0.83}_{-0.71}\\,\\mathrm{\\mu as}}}% ring-diameter: entry 57, ring, diameter',
        '\\newcommand{\\PositionAngle}{\\ensuremath{{155.2}^{+5.3}_{-5.2}\\,{}^{\\circ}}}% position-angle: entry 58, ring, diameter',
        '\\newcommand{\\FluxTwo}{\\ensuremath{{0.62}\\,\\mathrm{Jy}}}% flux-2: entry 57, flux, total',
        '',
      ].join('\n'),
    );
  });

  it('holds nothing that LaTeX chokes on, whatever the names, units and values are', () => {
    const size = fc.double({ noNaN: true, noDefaultInfinity: true, min: -1e15, max: 1e15 });
    const one = fc
      .record({ name: fc.string(), unit: fc.string(), value: size, down: size, up: size, key: fc.string() })
      .map(({ value, down, up, ...rest }) =>
        published({ ...rest, value, low: value - Math.abs(down), high: value + Math.abs(up) }),
      );
    fc.assert(
      fc.property(fc.array(one, { maxLength: 5 }), fc.string(), (numbers, recipe) => {
        const lines = formatNumbersTex(numbers, { recipe, run: 1 }).split('\n');
        expect(lines).toHaveLength(numbers.length + 2);
        expect(lines[0]).toMatch(/^% [\x20-\x7e]*$/);
        for (const each of lines.slice(1, -1)) expect(each).toMatch(line);
      }),
      { numRuns: 300 },
    );
  });

  it('names macros with letters only, each once and none that LaTeX has', () => {
    expect(texMacroNames(['ring-diameter', 'ring-1', 'ring-one', 'ring_1', 'sigma', 'Größe', '日'])).toEqual([
      'RingDiameter',
      'RingOne',
      'RingOneValue',
      'RingOneValueB',
      'SigmaValue',
      'Grosse',
      'Number',
    ]);
    fc.assert(
      fc.property(fc.array(fc.string(), { maxLength: 40 }), (names) => {
        const macros = texMacroNames(names);
        expect(new Set(macros).size).toBe(names.length);
        for (const macro of macros) expect(macro).toMatch(/^[A-Z][A-Za-z]*$/);
      }),
    );
  });

  it('sets units of VOUnits', () => {
    expect(texUnit('')).toBe('');
    expect(texUnit('mJy/uas**2')).toBe('\\mathrm{mJy}/\\mathrm{\\mu as}^{2}');
    expect(texUnit('Jy.pixel-1')).toBe('\\mathrm{Jy}\\,\\mathrm{pixel}^{-1}');
    expect(texUnit('a_b')).toBe('\\mathrm{a\\_b}');
  });
});

describe('numbers.json', () => {
  it('holds every digit and says where each number comes from', () => {
    const exact = published({
      value: 42.12345678901234,
      against: { value: 42, unit: 'uas', entry: 51 },
      tolerance: 0.01,
    });
    expect(JSON.parse(formatNumbersJson([exact], heading))).toEqual({
      recipe: 'lantern-ring',
      run: 3,
      numbers: [exact],
    });
    expect(formatNumbersJson([], heading)).toBe(
      '{\n  "recipe": "lantern-ring",\n  "run": 3,\n  "numbers": []\n}\n',
    );
  });
});

describe('rounded number', () => {
  it('gives value, ends and text to one place', () => {
    expect(roundedNumber(42.1234, 41.41, 42.95)).toEqual({
      value: '42.12',
      low: '41.41',
      high: '42.95',
      text: '42.12 +0.83 −0.71',
    });
    expect(roundedNumber(42.1, null, null)).toEqual({ value: '42.1', low: null, high: null, text: '42.1' });
  });
});
