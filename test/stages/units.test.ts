import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { InputProblem } from '../../stages/problem.ts';
import { baseUnits, commonUnits, definitions, dimensionNames } from '../../stages/unit-table.ts';
import { convert, dimensionOf, formatQuantity, isUnit, nearUnit, parseQuantity } from '../../stages/units.ts';

const A_UNIT = 'expected a unit of VOUnits 1.0, such as `uas`, `GHz`, `Jy/beam`';
const GRAMMAR = 'Write `.` for a product, one `/`, `**` for a power; letters count as they stand.';
const A_QUANTITY = 'quantity: bad-quantity: expected a number, a space and a unit, such as `160 uas`';

function messageOf(run: () => unknown): string {
  try {
    run();
  } catch (error) {
    if (error instanceof InputProblem) return error.message;
    throw error;
  }
  return 'no error';
}

describe('parseQuantity', () => {
  test.each([
    ['160 uas', 160, 'uas'],
    ['-1.5e-3  Jy/beam', -0.0015, 'Jy/beam'],
    ['+.5 mm', 0.5, 'mm'],
    ['5. min', 5, 'min'],
    ['0.3', 0.3, ''],
    ['-0 uas', 0, 'uas'],
  ])('reads "%s"', (text, value, unit) => expect(parseQuantity(text)).toEqual({ value, unit }));

  test.each([
    ['160uas', `${A_QUANTITY}, got "160uas". Write \`160 uas\`.`],
    ['uas', `${A_QUANTITY}, got "uas". Write the number with a decimal point, one space, then the unit.`],
    ['', `${A_QUANTITY}, got "". Write the number with a decimal point, one space, then the unit.`],
    [
      '1,5 uas',
      `${A_QUANTITY}, got "1,5 uas". Write the number with a decimal point, one space, then the unit.`,
    ],
    [
      'NaN uas',
      `${A_QUANTITY}, got "NaN uas". Write the number with a decimal point, one space, then the unit.`,
    ],
    [
      '0x10 s',
      `${A_QUANTITY}, got "0x10 s". Write the number with a decimal point, one space, then the unit.`,
    ],
    ['1e999 s', `${A_QUANTITY}, got "1e999 s". The number is beyond what a double holds.`],
    ['1 μas', `unit \`μas\`: bad-unit: ${A_UNIT}, got \`μas\`. Did you mean \`uas\`?`],
    ['1 furlong', `unit \`furlong\`: bad-unit: ${A_UNIT}, got the unknown unit \`furlong\`. ${GRAMMAR}`],
    ['1 W/m**2/Hz', `unit \`W/m**2/Hz\`: bad-unit: ${A_UNIT}, got \`/Hz\` after the unit. ${GRAMMAR}`],
    [
      '1 m**(1/3)',
      `unit \`m**(1/3)\`: bad-unit: ${A_UNIT}, got a power that is no whole or half number of at most 99. ${GRAMMAR}`,
    ],
    ['1 log(Hz)', `unit \`log(Hz)\`: bad-unit: ${A_UNIT}, got \`log()\`, which has no scale. ${GRAMMAR}`],
    ['1 (m.s', `unit \`(m.s\`: bad-unit: ${A_UNIT}, got brackets that do not close. ${GRAMMAR}`],
    ['1 m.', `unit \`m.\`: bad-unit: ${A_UNIT}, got an end where a unit must stand. ${GRAMMAR}`],
    ['1 sqrt(sqrt(m))', `unit \`sqrt(sqrt(m))\`: bad-unit: ${A_UNIT}, got a root of a root. ${GRAMMAR}`],
  ])('refuses "%s"', (text, message) => expect(messageOf(() => parseQuantity(text))).toBe(message));

  test('reads what formatQuantity writes', () => {
    const value = fc.double({ noNaN: true, noDefaultInfinity: true });
    fc.assert(
      fc.property(value, fc.constantFrom('', ...commonUnits), (value, unit) => {
        expect(parseQuantity(formatQuantity(value, unit))).toEqual({ value: value + 0, unit });
      }),
    );
  });

  test('throws nothing but an InputProblem, whatever the text', () => {
    const piece = fc.constantFrom(
      '1',
      ' ',
      'm',
      '.',
      '/',
      '**',
      '(',
      ')',
      'sqrt(',
      '10**',
      '-99',
      '%',
      'uas',
      'k',
      'μ',
    );
    const text = fc.oneof(
      fc.string({ unit: 'binary' }),
      fc.array(piece, { maxLength: 30 }).map((p) => p.join('')),
    );
    fc.assert(
      fc.property(text, (text) => {
        messageOf(() => parseQuantity(text));
        messageOf(() => parseQuantity(`1 ${text}`));
      }),
    );
  });
});

describe('convert', () => {
  test('gives the same number however a quantity is written', () => {
    // 1 mas = 1000 uas and so on: the decimal point moves, nothing else may.
    const digits = fc.integer({ min: -99_999_999, max: 99_999_999 });
    fc.assert(
      fc.property(digits, fc.integer({ min: -9, max: 9 }), (digits, exponent) => {
        expect(convert(Number(`${digits}e${exponent - 3}`), 'mas', 'uas')).toBe(
          Number(`${digits}e${exponent}`) + 0,
        );
        expect(convert(Number(`${digits}e${exponent}`), 'Hz', 'GHz')).toBe(
          Number(`${digits}e${exponent - 9}`) + 0,
        );
      }),
    );
  });

  test('comes back to its number over an irrational factor, to one unit in the last place each way', () => {
    fc.assert(
      fc.property(fc.double({ min: 1e-12, max: 1e12, noNaN: true }), (value) => {
        const back = convert(convert(value, 'uas', 'rad'), 'rad', 'uas');
        expect(Math.abs(back - value)).toBeLessThanOrEqual(4 * Number.EPSILON * value);
      }),
    );
  });

  // Math.SQRT1_2 and sqrt are exactly specified; sqrt(kHz) = sqrt(1000) sqrt(Hz).
  test('takes roots', () => {
    expect(convert(1, 'sqrt(MHz)', 'Hz**(1/2)')).toBe(1000);
    expect(convert(1, 'sqrt(kHz)', 'sqrt(Hz)')).toBe(Math.sqrt(1000));
  });

  test('knows products, quotients, powers, brackets and factors', () => {
    expect(convert(1, 'km/h', 'm.s**-1')).toBe(1 / 3.6);
    expect(convert(1, 'W/(m**2.Hz)', 'Jy')).toBe(1e26);
    expect(convert(1, '10**-26W.m**-2.Hz**-1', 'Jy')).toBe(1);
    expect(convert(3, '10**3m', 'km')).toBe(3);
    expect(convert(2, '1/s', 'Hz')).toBe(2);
    expect(convert(5, '%', '')).toBe(0.05);
    expect(convert(1, 'deg**2', 'arcsec**2')).toBe(3600 * 3600);
  });

  test('keeps NaN, infinities and the same unit', () => {
    expect(convert(Number.NaN, 'mas', 'uas')).toBeNaN();
    expect(convert(Number.POSITIVE_INFINITY, 'mas', 'uas')).toBe(Number.POSITIVE_INFINITY);
    expect(convert(0.1 + 0.2, 'uas', 'uas')).toBe(0.1 + 0.2);
  });

  test('refuses unlike dimensions', () => {
    expect(messageOf(() => convert(10, 'min', 'uas'))).toBe(
      'unit `min`: wrong-dimension: expected a unit of angle, such as `uas`, got `min` (time). ' +
        'Write the quantity in a unit of the right dimension.',
    );
    expect(messageOf(() => convert(1, 'uas', ''))).toContain('got `uas` (angle)');
  });
});

describe('dimensionOf', () => {
  test.each([
    ['uas', 'angle'],
    ['Jy/beam', 'flux density per beam'],
    ['s**-1', 'frequency'],
    ['W.m**-2.Hz**-1', 'flux density'],
    ['', 'dimensionless'],
    ['%', 'dimensionless'],
    ['sqrt(Hz)', 's**(-1/2)'],
    ['kg.m**2', 'm**2.g'],
  ])('calls `%s` %s', (unit, name) => expect(dimensionOf(unit)).toBe(name));

  test('has one name for each dimension', () => {
    expect(dimensionNames.map(([, unit]) => dimensionOf(unit))).toEqual(dimensionNames.map(([name]) => name));
  });
});

describe('the table of units', () => {
  test('holds only definitions that can be read', () => {
    for (const unit of [...Object.keys(definitions), ...baseUnits, ...commonUnits])
      expect(isUnit(unit)).toBe(true);
  });

  // VOUnits 1.0: a whole symbol is known before a prefixed one; no peta-year, centiday, picohour.
  test.each([
    ['Pa', 'pressure'],
    ['cd', 'cd'],
    ['ph', 'count'],
    ['min', 'time'],
    ['dam', 'length'],
  ])('reads `%s` as a unit of %s', (unit, dimension) => expect(dimensionOf(unit)).toBe(dimension));
});

describe('nearUnit', () => {
  test.each([
    ['μas', 'uas'],
    ['µas', 'uas'],
    ['microarcsec', 'uas'],
    ['ghz', 'GHz'],
    ['degrees', 'deg'],
    ['Jy per beam', 'Jy/beam'],
    ['m^2', 'm**2'],
    ['uass', 'uas'],
    ['hr', 'h'],
  ])('takes `%s` for `%s`', (text, unit) => expect(nearUnit(text)).toBe(unit));

  test('knows nothing near to `furlong`', () => expect(nearUnit('furlong')).toBeUndefined());
});
