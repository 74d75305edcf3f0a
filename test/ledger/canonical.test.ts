/** Reading canonical JSON: whatever is not exactly what canonicalJson writes is refused, by the quick look and by the
 *  thorough one alike. Published values: test/published/canonical-json.test.ts. */

import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { canonicalJson, parseCanonical } from '../../ledger/canonical.ts';
import type { Json } from '../../ledger/entry.ts';

const parse = (text: string) => parseCanonical(Buffer.from(text));

test('any value comes back from its canonical text', () => {
  fc.assert(
    fc.property(fc.jsonValue({ maxDepth: 5 }), (value) => {
      const text = canonicalJson(value as Json);
      expect(canonicalJson(parse(text))).toBe(text);
    }),
  );
});

// RFC 8785: key order by UTF-16 code units (3.2.3), numbers and strings as ECMAScript writes them (3.2.2), no lone
// surrogates, no white space. Each differs in one point from a text that is canonical.
describe.each([
  ['keys out of order', '{"b":1,"a":2}', '{"a":2,"b":1}'],
  ['keys out of order deep down', '[{"x":[{"b":1,"a":2}]}]', '[{"x":[{"a":2,"b":1}]}]'],
  ['keys in the order of numbers', '{"9":1,"10":2}', '{"10":2,"9":1}'],
  ['keys in the order of code points', '{"\ufb33":1,"\u{1f600}":2}', '{"\u{1f600}":2,"\ufb33":1}'],
  ['a key twice', '{"a":1,"a":1}', '{"a":1}'],
  ['a blank', '{"a": 1}', '{"a":1}'],
  ['a number with a needless decimal', '[1.0]', '[1]'],
  ['a number with an exponent', '[1e2]', '[100]'],
  ['a negative zero', '[-0]', '[0]'],
  ['an escape that is not needed', '["\\u0041\\/"]', '["A/"]'],
  ['an escape in capitals', '["\\u001F"]', '["\\u001f"]'],
  ['half of a pair of code units', '["\\ud800"]', '["\u{10000}"]'],
  ['the other half, in a key', '{"\\udfff":1}', '{"\u{103ff}":1}'],
])('%s', (_, wrong, right) => {
  test('is refused', () => {
    expect(() => parse(wrong)).toThrow(/expected (canonical JSON|Unicode text)/);
  });

  test('is what makes the difference', () => {
    expect(canonicalJson(parse(right))).toBe(right);
  });
});

test('a text that only speaks of a surrogate is canonical', () => {
  expect(parse('["\\\\ud800"]')).toEqual(['\\ud800']);
});
