import { readFileSync } from 'node:fs';
import { createRequire } from 'node:module';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { CAP_HEIGHT, outlineOf, UNITS_PER_EM } from '../../../stages/formats/drawing/font.ts';
import { decimal, element, escapeXml, startCanvas } from '../../../stages/formats/drawing/svg.ts';
import { plainText, setText, textPath, textWidth } from '../../../stages/formats/drawing/text.ts';

/** Table `tag` of the font file, by its directory (OpenType 1.9, "Organization of an OpenType Font"). */
function fontTable(tag: string): DataView {
  const path = createRequire(import.meta.url).resolve('dejavu-fonts-ttf/ttf/DejaVuSans.ttf');
  const file = readFileSync(path);
  for (let k = 0; k < file.readUInt16BE(4); k++) {
    const at = 12 + 16 * k;
    if (file.toString('latin1', at, at + 4) !== tag) continue;
    return new DataView(file.buffer, file.byteOffset + file.readUInt32BE(at + 8), file.readUInt32BE(at + 12));
  }
  throw new Error(tag);
}

function canvas() {
  return startCanvas({ name: 'test', width: 100, height: 50, title: 'T', description: 'D' });
}

describe('font', () => {
  it('has the advances that the metrics table of the font file holds', () => {
    const metrics = fontTable('hmtx');
    for (const character of 'Aµ−λ²9') {
      const { index, advance } = outlineOf(character, 'upright');
      expect(advance).toBe(metrics.getUint16(4 * index));
    }
    expect(UNITS_PER_EM).toBe(fontTable('head').getUint16(18));
  });

  it('has capitals of the height stated', () => {
    const heights = [...outlineOf('H', 'upright').path.matchAll(/ (-?\d+)/g)].map(([, y]) => Number(y));
    expect(Math.max(...heights)).toBe(CAP_HEIGHT * UNITS_PER_EM);
  });
});

describe('text', () => {
  it('defines every glyph once and keeps the words findable', () => {
    const page = canvas();
    setText(page, 'abba *u*', { x: 10, y: 20 });
    setText(page, 'ab', { x: 10, y: 40 });
    const svg = page.finish();
    expect(svg.match(/<path id="u61"/g)).toHaveLength(1);
    expect(svg.match(/href="#u61"/g)).toHaveLength(3);
    expect(svg.match(/href="#o75"/g)).toHaveLength(1);
    expect(svg).toContain('aria-label="abba u"');
    expect(svg).not.toContain('<text');
  });

  it('is as wide as its parts when nothing is kerned', () => {
    expect(textWidth('42.1', 20)).toBeCloseTo(textWidth('42', 20) + textWidth('.1', 20), 9);
    expect(textWidth('nn', 10)).toBeCloseTo(2 * textWidth('n', 10), 9);
    expect(textWidth('AV', 10)).toBeLessThan(textWidth('A', 10) + textWidth('V', 10));
  });

  it('makes one path that stays between the ends of the line', () => {
    const data = textPath('Plate 57b-K3Q9M2', 100, 50, 10);
    const numbers = data.match(/-?[\d.]+/g)?.map(Number) ?? [];
    const xs = numbers.filter((_, k) => k % 2 === 0);
    const ys = numbers.filter((_, k) => k % 2 === 1);
    expect(Math.min(...xs)).toBeGreaterThan(99);
    expect(Math.max(...xs)).toBeLessThan(101 + textWidth('Plate 57b-K3Q9M2', 10));
    expect(Math.min(...ys)).toBeGreaterThan(41);
    expect(Math.max(...ys)).toBeLessThan(53);
  });
});

describe('svg', () => {
  it('writes numbers with fixed decimals, without exponent and negative nought', () => {
    expect([1, -0.001, 1.005, 0.1 + 0.2, -2.5, 1e-9, 1234567.891].map((x) => decimal(x))).toEqual([
      '1',
      '0',
      '1',
      '0.3',
      '-2.5',
      '0',
      '1234567.89',
    ]);
    expect(() => decimal(Number.NaN)).toThrow('decimal: NaN cannot be drawn');
    expect(() => element('path', { x: Number.POSITIVE_INFINITY })).toThrow(
      'decimal: Infinity cannot be drawn',
    );
  });

  it('never lets text out of its place', () => {
    fc.assert(
      fc.property(fc.string(), (text) => {
        const escaped = escapeXml(text);
        expect(escaped).not.toMatch(/[<>"]|&(?!(amp|lt|gt|quot);)/);
        // biome-ignore lint/suspicious/noControlCharactersInRegex: XML 1.0 does not admit them
        expect(escaped).not.toMatch(/[\u0000-\u001f]/);
      }),
    );
    expect(plainText('*u* (Gλ)')).toBe('u (Gλ)');
  });

  it('leaves the plate strip below the drawing', () => {
    expect(canvas().finish()).toContain('width="100" height="74" viewBox="0 0 100 74"');
  });
});
