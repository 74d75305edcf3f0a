/** Canonical JSON against RFC 8785, against public test data of it, and against another implementation. */

import canonicalize from 'canonicalize';
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { canonicalJson, parseCanonical } from '../../ledger/canonical.ts';
import { sha256 } from '../../ledger/digest.ts';

const double = (hex: string) => Buffer.from(hex, 'hex').readDoubleBE();
const canonicalOf = (text: string) => canonicalJson(JSON.parse(text));

describe('numbers', () => {
  // Source: RFC 8785, appendix B: bits of an IEEE 754 double, and its JSON.
  test.each([
    ['0000000000000000', '0'],
    ['8000000000000000', '0'],
    ['0000000000000001', '5e-324'],
    ['8000000000000001', '-5e-324'],
    ['7fefffffffffffff', '1.7976931348623157e+308'],
    ['ffefffffffffffff', '-1.7976931348623157e+308'],
    ['4340000000000000', '9007199254740992'],
    ['c340000000000000', '-9007199254740992'],
    ['4430000000000000', '295147905179352830000'],
    ['44b52d02c7e14af5', '9.999999999999997e+22'],
    ['44b52d02c7e14af6', '1e+23'],
    ['44b52d02c7e14af7', '1.0000000000000001e+23'],
    ['444b1ae4d6e2ef4e', '999999999999999700000'],
    ['444b1ae4d6e2ef4f', '999999999999999900000'],
    ['444b1ae4d6e2ef50', '1e+21'],
    ['3eb0c6f7a0b5ed8c', '9.999999999999997e-7'],
    ['3eb0c6f7a0b5ed8d', '0.000001'],
    ['41b3de4355555553', '333333333.3333332'],
    ['41b3de4355555554', '333333333.33333325'],
    ['41b3de4355555555', '333333333.3333333'],
    ['41b3de4355555556', '333333333.3333334'],
    ['41b3de4355555557', '333333333.33333343'],
    ['becbf647612f3696', '-0.0000033333333333333333'],
    ['43143ff3c1cb0959', '1424953923781206.2'],
  ])('writes the double %s as %s', (bits, text) => {
    expect(canonicalJson(double(bits))).toBe(text);
  });

  // Source: RFC 8785, appendix B, last rows; minus infinity from memory of IEEE 754.
  test.each([
    ['7fffffffffffffff', 'NaN'],
    ['7ff0000000000000', 'Infinity'],
    ['fff0000000000000', '-Infinity'],
  ])('refuses the double %s', (bits, name) => {
    expect(() => canonicalJson({ value: [double(bits)] })).toThrow(
      `value.value.0: expected a finite number, got ${name}.`,
    );
  });

  // Source: RFC 8785, section 3.2.2.3, and ECMA-262, Number::toString.
  test.each([
    ['-0', '0'],
    ['1e21', '1e+21'],
    ['1e-7', '1e-7'],
    ['1E-6', '0.000001'],
    ['4.50', '4.5'],
    ['2e-3', '0.002'],
    ['0.000000000000000000000000001', '1e-27'],
    ['1E30', '1e+30'],
    ['333333333.33333329', '333333333.3333333'],
    ['56.0', '56'],
    ['100000000000000000000', '100000000000000000000'],
    ['123456789012345680000', '123456789012345680000'],
    ['0.1', '0.1'],
    ['1.0e0', '1'],
  ])('writes %s as %s', (text, canonical) => {
    expect(canonicalOf(text)).toBe(canonical);
  });
});

describe('documents', () => {
  // Source: RFC 8785, sections 3.2.2 to 3.2.4.
  test('writes the example of section 3.2.2 with the bytes of section 3.2.4', () => {
    const input =
      '{\n  "numbers": [333333333.33333329, 1E30, 4.50, 2e-3, 0.000000000000000000000000001],\n  "string": "\\u20ac$\\u000F\\u000aA\'\\u0042\\u0022\\u005c\\\\\\"\\/",\n  "literals": [null, true, false]\n}';
    const hex =
      '7b226c69746572616c73223a5b6e756c6c2c747275652c66616c73655d2c226e756d62657273223a5b3333333333333333332e333333333333332c31652b33302c342e352c302e3030322c31652d32375d2c22737472696e67223a22e282ac245c75303030665c6e4127425c225c5c5c5c5c222f227d';
    expect(Buffer.from(canonicalOf(input)).toString('hex')).toBe(hex);
  });

  // Source: RFC 8785, section 3.2.3. By code points U+FB33 would come before U+1F600.
  test('sorts keys by UTF-16 code units', () => {
    const input =
      '{"\\u20ac":"Euro Sign","\\r":"Carriage Return","\\ufb33":"Hebrew Letter Dalet With Dagesh","1":"One","\\ud83d\\ude00":"Emoji: Grinning Face","\\u0080":"Control","\\u00f6":"Latin Small Letter O With Diaeresis"}';
    const output =
      '{"\\r":"Carriage Return","1":"One","\u0080":"Control","\u00f6":"Latin Small Letter O With Diaeresis","\u20ac":"Euro Sign","\ud83d\ude00":"Emoji: Grinning Face","\ufb33":"Hebrew Letter Dalet With Dagesh"}';
    expect(canonicalOf(input)).toBe(output);
    // Derived from that text with coreutils' sha256sum.
    expect(sha256(output)).toBe('5e321556d22018a9656991a9e94f77ec175fa193e52a2429d312f8419ec8b08c');
  });

  // Source: public JCS test data (arrays, structures, unicode, french); the last from ECMA-262, QuoteJSONString.
  test.each([
    ['[56,{"d":true,"10":null,"1":[]}]', '[56,{"1":[],"10":null,"d":true}]'],
    [
      '{"1":{"f":{"f":"hi","F":5},"\\n":56.0},"10":{},"":"empty","a":{},"111":[{"e":"yes","E":"no"}],"A":{}}',
      '{"":"empty","1":{"\\n":56,"f":{"F":5,"f":"hi"}},"10":{},"111":[{"E":"no","e":"yes"}],"A":{},"a":{}}',
    ],
    ['{"Unnormalized Unicode":"A\\u030a"}', '{"Unnormalized Unicode":"A\u030a"}'],
    [
      '{"peach":1,"p\u00e9ch\u00e9":2,"p\u00eache":3,"sin":4}',
      '{"peach":1,"p\u00e9ch\u00e9":2,"p\u00eache":3,"sin":4}',
    ],
    ['"\\u2028\\u2029\\u007f\\u0000\\b\\f\\t\\/"', '"\u2028\u2029\u007f\\u0000\\b\\f\\t/"'],
  ])('writes %s', (input, output) => {
    expect(canonicalOf(input)).toBe(output);
  });

  // Source: Node 20.20.2 over the same stream: x = 6364136223846793005 x + 1442695040888963407 mod 2^64, from 1.
  test('writes 100,000 doubles of a congruential stream', () => {
    let x = 1n;
    const lines: string[] = [];
    const view = new DataView(new ArrayBuffer(8));
    while (lines.length < 100_000) {
      x = BigInt.asUintN(64, x * 6364136223846793005n + 1442695040888963407n);
      view.setBigUint64(0, x);
      const value = view.getFloat64(0);
      if (Number.isFinite(value)) lines.push(`${x.toString(16)},${canonicalJson(value)}\n`);
    }
    expect(sha256(lines.join(''))).toBe('9894e7000da5fd0a311a4e0af3d922041689e5169f008ea1efcd3d8032496a88');
  });
});

describe('properties', () => {
  const json = fc.jsonValue({ stringUnit: 'binary' });

  test('agrees with another implementation on any JSON', () => {
    fc.assert(
      fc.property(json, (value) => {
        expect(canonicalJson(value as never)).toBe(canonicalize(value));
      }),
    );
  });

  test('reads back what it wrote, and writes it the same again', () => {
    fc.assert(
      fc.property(json, (value) => {
        const text = canonicalJson(value as never);
        const read = parseCanonical(Buffer.from(text));
        expect(canonicalJson(read)).toBe(text);
        expect(read).toEqual(JSON.parse(JSON.stringify(value)));
      }),
    );
  });

  test('does not depend on the order of keys', () => {
    fc.assert(
      fc.property(fc.dictionary(fc.string(), fc.integer()), (object) => {
        const turned = Object.fromEntries(Object.entries(object).reverse());
        expect(canonicalJson(turned)).toBe(canonicalJson(object));
      }),
    );
  });

  test('refuses every other spelling', () => {
    fc.assert(
      fc.property(json, fc.nat(), fc.constantFrom(' ', '\n', '\t'), (value, at, blank) => {
        const text = canonicalJson(value as never);
        const place = at % 2 === 0 ? 0 : text.length;
        const other = text.slice(0, place) + blank + text.slice(place);
        expect(() => parseCanonical(Buffer.from(other))).toThrow('expected canonical JSON');
      }),
    );
  });
});

describe('refusals', () => {
  test.each([
    ['{"b":1,"a":2}', 'value: expected canonical JSON, got another spelling, from character 3 on.'],
    ['{"a":1,"a":1}', 'value: expected canonical JSON, got another spelling, from character 7 on.'],
    ['1.0', 'value: expected canonical JSON, got another spelling, from character 2 on.'],
    ['-0', 'value: expected canonical JSON, got another spelling, from character 1 on.'],
    ['"\\u0041"', 'value: expected canonical JSON, got another spelling, from character 2 on.'],
    ['\ufeff1', 'value: expected JSON, got something else'],
    ['', 'value: expected JSON, got something else'],
    ['{"a":1', 'value: expected JSON, got something else'],
  ])('does not read %s', (text, message) => {
    expect(() => parseCanonical(Buffer.from(text))).toThrow(message);
  });

  test('does not read bytes that are no UTF-8', () => {
    expect(() => parseCanonical(Buffer.from([0x22, 0xc0, 0x80, 0x22]))).toThrow('value: expected JSON');
  });

  test.each([
    [{ a: undefined }, 'value.a: expected a JSON value, got undefined.'],
    [[1, undefined], 'value.1: expected a JSON value, got undefined.'],
    [new Array(1), 'value.0: expected a JSON value, got undefined.'],
    [{ at: new Date(0) }, 'value.at: expected a plain object, got Date.'],
    [{ a: 1n }, 'value.a: expected a JSON value, got bigint.'],
    [['\ud800'], 'value.0: expected Unicode text, got a lone surrogate.'],
    [{ '\udc00': 1 }, 'value.\udc00: expected Unicode text, got a lone surrogate.'],
  ])('does not write %o', (value, message) => {
    expect(() => canonicalJson(value as never)).toThrow(message);
  });

  test('does not write a loop', () => {
    const loop: { self?: unknown } = {};
    loop.self = loop;
    expect(() => canonicalJson(loop as never)).toThrow('expected at most 500 levels, got more, or a loop.');
  });

  // A key that assignment would swallow stays a key.
  test('keeps the key __proto__', () => {
    expect(canonicalOf('{"__proto__":{"a":1}}')).toBe('{"__proto__":{"a":1}}');
  });
});
