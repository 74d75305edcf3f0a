/** JSON and numbers: layout to the byte, round trips, and the texts of errors. */

import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { sourceOf } from '../../../stages/bytes.ts';
import type { Numbers } from '../../../stages/data.ts';
import { readJson, readNumbers, writeJson, writeNumbers } from '../../../stages/formats/json.ts';
import { problemOf, written } from './fits/fixtures.ts';

const text = (source: ReturnType<typeof written>) =>
  Buffer.from(source.read(0, source.size)).toString('utf8');
const of = (content: string | Uint8Array) => sourceOf(new Uint8Array(Buffer.from(content)), 'report');

describe('json', () => {
  // Source: the layout in CONVENTIONS.
  test('is written with two spaces, a final newline and lists for typed arrays', () => {
    expect(text(written((sink) => writeJson(sink, { b: 1.5, a: Float64Array.of(1, 2), c: 'µ' })))).toBe(
      '{\n  "b": 1.5,\n  "a": [\n    1,\n    2\n  ],\n  "c": "µ"\n}\n',
    );
  });

  test('comes back', () => {
    fc.assert(
      fc.property(fc.jsonValue(), (value) => {
        const back = readJson(written((sink) => writeJson(sink, value)));
        expect(back).toEqual(JSON.parse(JSON.stringify(value)));
      }),
    );
  });

  test('never holds a number that is not finite', () => {
    expect(() => written((sink) => writeJson(sink, { a: { b: Number.NaN } }))).toThrow('writeJson: b is NaN');
    expect(() => written((sink) => writeJson(sink, Float64Array.of(1, Infinity)))).toThrow(
      'writeJson: 1 is Infinity',
    );
    expect(() => written((sink) => writeJson(sink, undefined))).toThrow(
      'writeJson: undefined is no JSON value',
    );
  });

  test('that is none is refused', () => {
    expect(problemOf(() => readJson(of('{"a": 1,}'))).message).toMatch(
      /^report: bad-json: expected one JSON document in UTF-8, got .*position 8.*\. Correct the file at that place\.$/,
    );
    expect(problemOf(() => readJson(of(Uint8Array.of(0x22, 0xff, 0x22)))).code).toBe('bad-json');
  });
});

describe('numbers', () => {
  const numbers: Numbers = {
    values: {
      diameter: { definition: 'ridge', value: 41.5, unit: 'uas', high: 42, low: 41, low95: 40, high95: 43 },
      flux: { value: 1, unit: 'Jy', definition: 'sum' },
    },
    remarks: ['invented'],
  };

  test('come back, keys in the order of the type', () => {
    const source = written((sink) => writeNumbers(sink, numbers));
    expect(readNumbers(source)).toEqual(numbers);
    const keys = Object.keys((JSON.parse(text(source)) as Numbers).values.diameter ?? {});
    expect(keys).toEqual(['value', 'unit', 'low', 'high', 'low95', 'high95', 'definition']);
  });

  test('that are not of that layout are refused', () => {
    const read = (content: unknown) => problemOf(() => readNumbers(of(JSON.stringify(content))));
    expect(read({ values: { a: { value: '1', unit: '', definition: '' } }, remarks: [] }).place).toBe(
      'report, values.a.value',
    );
    expect(read([]).place).toBe('report, the document');
    expect(read({ values: {} }).code).toBe('bad-numbers');
  });
});
