import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { roundedNumber, roundNumber } from '../../../stages/formats/drawing/rounding.ts';
import {
  linearScale,
  logScale,
  roundTicks,
  superscript,
  tickLabel,
} from '../../../stages/formats/drawing/scale.ts';

const finite = fc.double({ min: -1e6, max: 1e6, noNaN: true });

describe('scales', () => {
  it('puts ticks where a person would', () => {
    // Worked by hand.
    expect(roundTicks(0, 10, 5)).toEqual([0, 2, 4, 6, 8, 10]);
    expect(roundTicks(-0.31, 0.32, 6)).toEqual([-0.3, -0.2, -0.1, 0, 0.1, 0.2, 0.3]);
    expect(tickLabel(-0.3, 0.1)).toBe('−0.3');
    expect(tickLabel(0, 0.05)).toBe('0.00');
    expect(tickLabel(250000, 50000)).toBe('250000');
    expect(superscript(-12)).toBe('⁻¹²');
  });

  it('has about as many ticks as asked for on any domain, all of them inside', () => {
    fc.assert(
      fc.property(
        finite,
        fc.double({ min: 1e-6, max: 1e6, noNaN: true }),
        fc.integer({ min: 3, max: 9 }),
        (from, width, about) => {
          const ticks = roundTicks(from, from + width, about);
          expect(ticks.length).toBeGreaterThanOrEqual(Math.floor(about / 2));
          expect(ticks.length).toBeLessThanOrEqual(2 * about + 1);
          for (const tick of ticks) {
            expect(tick).toBeGreaterThanOrEqual(from - 1e-6 * width - 1e-9 * Math.abs(from));
            expect(tick).toBeLessThanOrEqual(from + width * (1 + 1e-6) + 1e-9 * Math.abs(from));
          }
        },
      ),
    );
  });

  it('maps the ends of a domain to the ends of the range', () => {
    fc.assert(
      fc.property(finite, fc.double({ min: 0.01, max: 1e4, noNaN: true }), (from, width) => {
        const scale = linearScale([from, from + width], [300, 10]);
        expect(scale.at(from)).toBeCloseTo(300, 6);
        expect(scale.at(from + width)).toBeCloseTo(10, 6);
      }),
    );
    const log = logScale([0.01, 100], [0, 400]);
    expect([0.01, 0.1, 1, 100].map(log.at)).toEqual([0, 100, 200, 400]);
    expect(log.ticks.filter(({ label }) => label !== '').map(({ label }) => label)).toEqual([
      '0.01',
      '0.1',
      '1',
      '10',
      '100',
    ]);
  });

  it('refuses a scale without length or with NaN', () => {
    expect(() => linearScale([1, 1], [0, 1])).toThrow('linearScale: no scale from 1 to 1');
    expect(() => linearScale([Number.NaN, 1], [0, 1])).toThrow('linearScale: no scale from NaN to 1');
    expect(() => logScale([0, 1], [0, 1])).toThrow('logScale: no logarithmic scale from 0 to 1');
  });
});

describe('rounding', () => {
  it('rounds to two significant digits of the smaller side', () => {
    // Worked by hand.
    expect(roundedNumber(42.1234, 41.41, 42.95)).toBe('42.12 +0.83 −0.71');
    expect(roundedNumber(1234.5, 784.5, 1700)).toBe('1230 +470 −450');
    expect(roundedNumber(-3.2, -3.3, -3.15)).toBe('−3.200 +0.050 −0.100');
    expect(roundedNumber(9.996, 9.0004, 10.992)).toBe('10.0 +1.0 −1.0');
    expect(roundedNumber(0.001, -2, 2)).toBe('0.0 +2.0 −2.0');
    expect(roundedNumber(5, 5, 6)).toBe('5.0 +1.0 −0.0');
    expect(roundedNumber(1.2e-12, 1.1e-12, 1.4e-12)).toBe('1.20 +0.20 −0.10 e−12');
  });

  it('shows a number without interval with six significant digits', () => {
    expect(roundedNumber(42.123456789, null, null)).toBe('42.1235');
    expect(roundedNumber(0, null, null)).toBe('0');
    expect(roundedNumber(5, 5, 5)).toBe('5');
    expect(roundedNumber(-1.5e-9, null, null)).toBe('−1.5 e−9');
    expect(roundedNumber(Number.NaN, 1, 2)).toBe('NaN');
  });

  it('rounds once, also just below a power of ten', () => {
    // 999999.98406945 to six decimals by hand.
    expect(roundNumber(999999.9840694501, 999999.9840594501, 1000000.9840694501).value).toBe('999999.984069');
  });

  it('stays within half a unit of the last place', () => {
    fc.assert(
      fc.property(
        finite,
        fc.double({ min: 1e-5, max: 1e5, noNaN: true }),
        fc.double({ min: 1, max: 50, noNaN: true }),
        (value, side, ratio) => {
          const low = value - side;
          const high = value + side * ratio;
          fc.pre(low < value && value < high);
          const rounded = roundNumber(value, low, high);
          const scale = Number(`1e${rounded.exponent}`);
          const shorter = Math.min(value - low, high - value);
          const place = 10 ** (Math.floor(Math.log10(shorter)) - 1);
          // Where the shorter side rounds up to the next power of ten the place is one higher.
          const half = shorter / place > 99.4 ? 5.01 * place : 0.501 * place;
          expect(Math.abs(Number(rounded.value) * scale - value)).toBeLessThanOrEqual(half);
          expect(Math.abs(Number(rounded.up) * scale - (high - value))).toBeLessThanOrEqual(half);
          expect(Math.abs(Number(rounded.low) * scale - low)).toBeLessThanOrEqual(half);
        },
      ),
    );
  });
});

// ISO 80000-1, annex B: two digits of the side of 0.0263; the other is 2e-16, a unit in the last place of 1.
it('a side that is only rounding has no length', () => {
  expect(roundNumber(1, 0.9737, 1 + 2 ** -52)).toMatchObject({
    value: '1.000',
    low: '0.974',
    high: '1.000',
    down: '0.026',
  });
});
