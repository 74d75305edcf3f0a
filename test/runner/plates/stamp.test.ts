import { inflateSync } from 'node:zlib';
import { describe, expect, it } from 'vitest';
import { addPngText, readPngText } from '../../../runner/plates/png-text.ts';
import { renderPng } from '../../../runner/plates/render-png.ts';
import { stampFigure } from '../../../runner/plates/stamp.ts';
import { element, startCanvas } from '../../../stages/formats/drawing/svg.ts';
import { setText } from '../../../stages/formats/drawing/text.ts';
import { decodeColour } from '../../picture.ts';

function makeFigure(width = 320): Uint8Array {
  const canvas = startCanvas({ name: 'test', width, height: 100, title: 'Test', description: 'A square.' });
  canvas.add(element('rect', { x: 10, y: 30, width: 60, height: 60, fill: '#14506e' }));
  setText(canvas, 'square', { x: 80, y: 60 });
  return Buffer.from(canvas.finish());
}

const stamp = { plate: '57b-K3Q9M2', title: 'ring-image', recipe: 'lantern-ring' };
const text = (bytes: Uint8Array) => Buffer.from(bytes).toString('utf8');

describe('stamp', () => {
  it('gives the same bytes for the same figure', async () => {
    const [once, again] = [await stampFigure(makeFigure(), stamp), await stampFigure(makeFigure(), stamp)];
    expect(Buffer.compare(once.svg, again.svg)).toBe(0);
    expect(Buffer.compare(once.png, again.png)).toBe(0);
  });

  it('puts the plate number into metadata, PNG text and outlines', async () => {
    const { svg, png } = await stampFigure(makeFigure(), stamp);
    expect(text(svg)).toContain('<dcterms:identifier>57b-K3Q9M2</dcterms:identifier>');
    expect(text(svg)).toContain('aria-label="Plate 57b-K3Q9M2"');
    expect(readPngText(png)).toEqual({
      Title: 'ring-image',
      Description: 'Figure of the recipe lantern-ring.',
      Software: 'Platebook',
      Plate: '57b-K3Q9M2',
    });
  });

  it('sets the number in the strip at the lower right and changes nothing above it', async () => {
    const plain = decodeColour(await renderPng(makeFigure()), inflateSync);
    const { png } = await stampFigure(makeFigure(), stamp);
    const plate = decodeColour(png, inflateSync);
    expect([plate.width, plate.height]).toEqual([640, 248]);
    const stride = plain.width * plain.channels;
    const strip = 200 * stride; // two pixels a px
    expect(Buffer.compare(plate.pixels.subarray(0, strip), plain.pixels.subarray(0, strip))).toBe(0);
    const dark = [];
    for (let at = strip; at < plate.pixels.length; at += plate.channels) {
      if (plate.pixels[at] < 200) dark.push((at % stride) / plate.channels);
    }
    expect(dark.length).toBeGreaterThan(100);
    expect(Math.min(...dark)).toBeGreaterThan(400);
    expect(Math.max(...dark)).toBeLessThan(620);
  });

  it('sets a mark at the lower left, with its words in the text', async () => {
    const mark = 'Calibration out of limits: closure-scatter';
    const { svg, png } = await stampFigure(makeFigure(520), { ...stamp, mark });
    expect(text(svg)).toContain(`aria-label="${mark}"`);
    expect(readPngText(png).Warning).toBe(mark);
    const { svg: unmarked } = await stampFigure(makeFigure(), { ...stamp, mark: null });
    expect(text(unmarked)).not.toContain('dcterms:description');
  });

  it('shortens a mark that has no room and keeps its words findable', async () => {
    const mark = `Out of limits: ${'station-gains '.repeat(30)}`.trim();
    const { svg, png } = await stampFigure(makeFigure(), { ...stamp, mark });
    expect(text(svg)).toContain(`aria-label="${mark}"`);
    const { pixels, width, channels } = decodeColour(png, inflateSync);
    // White between the mark and the number, in every row of the strip.
    const gap = 640 - 2 * 12 - 2 * 95;
    for (let row = 202; row < 248; row++) expect(pixels[(row * width + gap) * channels]).toBe(255);
  });

  it('survives words that look like markup', async () => {
    const hostile = {
      plate: '1-000000',
      title: '</title><b a="&',
      recipe: ']]>\u0001→',
      mark: '<!-- \\ *µ*',
    };
    const { svg, png } = await stampFigure(makeFigure(), hostile);
    await expect(renderPng(svg)).resolves.toBeInstanceOf(Uint8Array);
    expect(readPngText(png).Title).toBe(hostile.title);
    expect(readPngText(png).Description).toBe(`Figure of the recipe ${hostile.recipe}.`);
  });

  it('refuses a plate', async () => {
    const { svg } = await stampFigure(makeFigure(), stamp);
    await expect(stampFigure(svg, stamp)).rejects.toThrow(
      'figure, metadata: already-plate: expected a figure without plate number, got plate 57b-K3Q9M2. ' +
        'Stamp the figure as its stage drew it.',
    );
  });

  it('refuses what is no figure', async () => {
    await expect(stampFigure(Buffer.from('{"no": 1}'), stamp)).rejects.toThrow(
      'figure, root element: not-figure: expected an SVG document with width and height in px, higher than the plate ' +
        'strip of 24, got text that begins with "{\\"no\\": 1}". Publish an output of format svg.',
    );
  });
});

describe('PNG text', () => {
  it('comes back, Latin-1 or not', async () => {
    const png = await renderPng('<svg xmlns="http://www.w3.org/2000/svg" width="3" height="2"/>', 1);
    const texts = { Title: 'ring µas', Plate: '57b-K3Q9M2', Comment: 'λ → 1.3 mm' };
    expect(readPngText(addPngText(png, texts))).toEqual(texts);
    expect(readPngText(png)).toEqual({});
  });

  it('says where a file is no PNG or cut short', async () => {
    expect(() => readPngText(Buffer.from('GIF89a'))).toThrow(
      'picture, byte 0: not-png: expected the signature of a PNG file, got 474946383961. Give a PNG file.',
    );
    const png = await renderPng('<svg xmlns="http://www.w3.org/2000/svg" width="3" height="2"/>', 1);
    expect(() => readPngText(png.subarray(0, png.length - 14))).toThrow(
      /^picture, byte \d+: truncated: expected a whole chunk/,
    );
  });
});
