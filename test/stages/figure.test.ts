import { inflateSync } from 'node:zlib';
import { describe, expect, it } from 'vitest';
import { renderPng } from '../../runner/plates/render-png.ts';
import type { ByteSink, ByteSource } from '../../stages/bytes.ts';
import { memorySink, sourceOf } from '../../stages/bytes.ts';
import { compute } from '../../stages/figure/compute.ts';
import { figure } from '../../stages/figure/figure.ts';
import { MICROARCSEC } from '../../stages/figure/sky.ts';
import { writeBasis } from '../../stages/formats/basis.ts';
import { writeJson, writeNumbers } from '../../stages/formats/json.ts';
import { writePosterior } from '../../stages/formats/posterior.ts';
import { writeSkyImage } from '../../stages/formats/sky-image.ts';
import { writeVisibilities } from '../../stages/formats/visibilities-write.ts';
import { decodeColour, decodeIndexed } from '../picture.ts';
import {
  crescent,
  inventedBasis,
  inventedPosterior,
  inventedResiduals,
  inventedVisibilities,
} from './figure-synthetic.ts';

function file(name: string, write: (sink: ByteSink) => void): ByteSource[] {
  const sink = memorySink();
  write(sink);
  return [sourceOf(sink.bytes().slice(), name)];
}

const truth = crescent(42, 2.5, 0.55, 2.6);
const model = crescent(42.4, 6.5, 0.45, 2.7, 0.6);
const visibilities = inventedVisibilities(truth, 5);
const basis = inventedBasis(8);
const diameter = { value: 42.3, unit: 'uas', low: 41.6, high: 43.1, definition: 'invented' };
const inputs: Record<string, ByteSource[]> = {
  visibilities: file('visibilities', (sink) => writeVisibilities(sink, visibilities)),
  image: file('image', (sink) => writeSkyImage(sink, model)),
  truth: file('truth', (sink) => writeSkyImage(sink, truth)),
  basis: file('basis', (sink) => writeBasis(sink, basis)),
  samples: file('samples', (sink) => writePosterior(sink, inventedPosterior(basis, 64))),
  ring: file('ring', (sink) => writeNumbers(sink, { values: { diameter }, remarks: [] })),
  residuals: file('residuals', (sink) => writeJson(sink, inventedResiduals(visibilities, model))),
  calibration: file('calibration', (sink) =>
    writeJson(sink, {
      findings: [
        { check: 'closure-scatter', finding: 'marginal', value: 2, marginal: 1.5, limit: 2.5 },
        { check: 'gains', finding: 'within limits', value: 0.1, marginal: 0.2, limit: 0.6 },
        { check: 'noise', finding: 'out of limits', value: 9, marginal: 1.4, limit: 1.8 },
      ],
      gainRatios: [
        { stations: ['AA', 'BB'], scans: [0, 1, 2], logRatio: [0.1, 0, -0.7], sigma: [0.02, 0.03, 0.02] },
      ],
    }),
  ),
};

function drawAll(given: Record<string, ByteSource[]>, wanted: readonly string[]): Record<string, string> {
  const outputs = Object.fromEntries(wanted.map((name) => [name, memorySink()]));
  const parameters = { shown: 12, draws: 16 };
  compute({ inputs: given, parameters, outputs, note: () => {}, progress: () => {} });
  return Object.fromEntries(
    wanted.map((name) => [name, Buffer.from(outputs[name].bytes()).toString('utf8')]),
  );
}

const names = Object.keys(figure.outputs);
const drawn = drawAll(inputs, names);

/** The rasters in a drawing, in order, with their places in px. */
function rasters(svg: string) {
  const pattern =
    /<image x="([\d.]+)" y="([\d.]+)" width="([\d.]+)" height="([\d.]+)" href="data:image\/png;base64,([^"]+)"/g;
  return [...svg.matchAll(pattern)].map(([, x, y, width, height, data]) => ({
    place: [x, y, width, height].map(Number),
    picture: decodeIndexed(Buffer.from(data, 'base64'), inflateSync),
  }));
}

describe('figure', () => {
  it('draws the same bytes again', () => {
    expect(drawAll(inputs, names)).toEqual(drawn);
  });

  for (const name of names) {
    it(`draws ${name} self-contained, without fonts, saying that the data are invented`, () => {
      const svg = drawn[name];
      const ids = [...svg.matchAll(/ id="([^"]+)"/g)].map(([, id]) => id);
      expect(new Set(ids).size).toBe(ids.length);
      const used = [...svg.matchAll(/href="#([^"]+)"|url\(#([^)]+)\)/g)].map(([, a, b]) => a ?? b);
      expect(used.filter((id) => !ids.includes(id))).toEqual([]);
      const markup = svg
        .replace(/data:image\/png;base64,[^"]*/g, '')
        .replaceAll('http://www.w3.org/2000/svg', '');
      expect(/<text|<style|<script|font-family|NaN|undefined|https?:/.exec(markup)).toBeNull();
      expect(markup).toContain('aria-label="Invented data"');
    });

    it(`leaves the strip for the plate number of ${name} empty`, async () => {
      // Half a pixel a px: the strip of 24 px (CONVENTIONS) is 12 rows, which must be white.
      const { width, height, channels, pixels } = decodeColour(
        await renderPng(drawn[name], 0.5),
        inflateSync,
      );
      const strip = pixels.subarray((height - 12) * width * channels);
      expect(strip.every((byte) => byte === 255)).toBe(true);
      expect(pixels.every((byte) => byte === 255)).toBe(false);
    });
  }

  it('shows north up and east left', () => {
    // CONVENTIONS: offset of pixel i is x = ((nx-1)/2 - i) pixel to the east, of row j y = (j - (ny-1)/2) pixel to the
    // north; so a source in the north-east has a small i and a large j.
    const [n, i, j] = [16, 3, 13];
    const pixels = new Float64Array(n * n);
    pixels[j * n + i] = 1;
    const spot = { nx: n, ny: n, pixelRadians: MICROARCSEC, pixels };
    const { image } = drawAll({ image: file('image', (sink) => writeSkyImage(sink, spot)) }, ['image']);
    const [{ picture }] = rasters(image);
    const brightest = picture.indices.indexOf(255);
    const [column, row] = [brightest % picture.width, Math.floor(brightest / picture.width)];
    // Edges of that pixel in the picture: (3 … 4)/16 from the left, (2 … 3)/16 from the top.
    expect(column / picture.width).toBeGreaterThan(3 / 16);
    expect(column / picture.width).toBeLessThan(4 / 16);
    expect(row / picture.height).toBeGreaterThan(2 / 16);
    expect(row / picture.height).toBeLessThan(3 / 16);
  });

  it('leaves a margin around an image that is smaller than the field', () => {
    const pixels = new Float64Array(32 * 16).fill(1);
    const flat = { nx: 32, ny: 16, pixelRadians: MICROARCSEC, pixels };
    const output = memorySink();
    const given = { image: file('image', (sink) => writeSkyImage(sink, flat)) };
    const parameters = { field: 20, shown: 12, draws: 16 };
    compute({ inputs: given, parameters, outputs: { image: output }, note: () => {}, progress: () => {} });
    const [{ place }] = rasters(Buffer.from(output.bytes()).toString('utf8'));
    // 20 µas wide of 32 and all 16 high: the picture fills the box across and 16/20 of it upwards, in the middle.
    expect(place[3] / place[2]).toBeCloseTo(16 / 20, 3);
    expect(place[1] - 44).toBeCloseTo(place[2] / 10, 1);
  });

  it('draws the ring, the scale bar and the picture to one scale', () => {
    const [{ place }] = rasters(drawn.image);
    const field = 64 * 2; // µas, of the invented image
    const pxPerMicroarcsec = place[2] / field;
    const radius = Number(/<circle[^>]* r="([\d.]+)"/.exec(drawn.image)?.[1]);
    expect(radius).toBeCloseTo((42.3 / 2) * pxPerMicroarcsec, 1);
    const bar =
      /<path d="M[\d.]+ [\d.]+h([\d.]+)"[^>]*stroke-width="2.5"\/>\s*<g role="img" aria-label="([\d.]+) µas"/.exec(
        drawn.image,
      );
    expect(Number(bar?.[1])).toBeCloseTo(Number(bar?.[2]) * pxPerMicroarcsec, 1);
  });

  it('draws one mark per visibility and conjugate, u growing to the left', () => {
    const dots = [...drawn.coverage.matchAll(/<path [^>]*d="((?:M[\d.]+ [\d.]+h\.01)+)"/g)].map(
      ([, d]) => d.match(/M/g)?.length,
    );
    expect(dots.slice(0, 2)).toEqual([visibilities.count, visibilities.count]);
    const tick = (label: string) => {
      const at = new RegExp(`aria-label="${label}" transform="translate\\(([\\d.]+) `).exec(drawn.coverage);
      return Number(at?.[1]);
    };
    expect(tick('2')).toBeLessThan(tick('−2'));
  });

  it('draws every datum of both sorts and names the calibration', () => {
    const { visibilities: rows, closurePhases } = inventedResiduals(visibilities, model);
    expect(drawn.data).toContain(`${rows.u.length} amplitudes, ${closurePhases.scan.length} closure phases`);
    const dots = [...drawn.data.matchAll(/d="((?:M[\d.]+ [\d.]+h\.01)+)"/g)].map(
      ([, d]) => d.match(/M/g)?.length,
    );
    const [a, c] = [rows.u.length, closurePhases.scan.length];
    // Measured, model and residual of each sort, then the two of the legend.
    expect(dots).toEqual([a, a, a, c, c, c, 1, 1]);
    expect(drawn.data).toContain(
      'aria-label="Calibration: 1 check within limits; marginal: closure-scatter; out of limits: noise"',
    );
  });

  it('draws a bar for every check as long as its value is to its limit, and every gain', () => {
    const bars = [
      ...drawn.calibration.matchAll(/<rect x="184" y="[\d.]+" width="([\d.]+)" height="14"/g),
    ].map(([, width]) => Number(width));
    // Limits are 2.5, 0.6 and 1.8: 0.8, 1/6, and 5, which is cut at 2.
    expect(bars[0] / bars[2]).toBeCloseTo(0.8 / 2, 3);
    expect(bars[1] / bars[2]).toBeCloseTo(1 / 6 / 2, 3);
    expect(drawn.calibration).toContain('aria-label="9  (1.4, 1.8)"');
    expect(drawn.calibration).toContain(
      'aria-label="gain ratios of co-located stations, ln less median; a lane is ±0.88"',
    );
    const dots = [...drawn.calibration.matchAll(/d="((?:M[\d.]+ [\d.]+h\.01)+)"/g)];
    expect(dots.map(([, d]) => d.match(/M/g)?.length)).toEqual([3]);
  });

  it('draws the gains of the fit in place of ratios, and says when no check was made', () => {
    const gainsOverTime = [{ station: 'CC', scans: [1, 2], logGain: [0, 0.2], deviations: [0.1, 0.1] }];
    const report = file('calibration', (sink) => writeJson(sink, { findings: [], gainsOverTime }));
    const { calibration } = drawAll({ ...inputs, calibration: report }, ['calibration']);
    expect(calibration).toContain('aria-label="No check was made."');
    expect(calibration).toContain('gains of the fit, ln less median');
    expect(calibration).toContain('aria-label="CC"');
  });

  it('refuses a calibration report without limits', () => {
    const findings = [{ check: 'gains', finding: 'marginal', value: 1, marginal: 1 }];
    const report = file('calibration', (sink) => writeJson(sink, { findings }));
    expect(() => drawAll({ calibration: report }, ['calibration'])).toThrow(
      /^calibration, findings\.0\.limit: wrong-document: expected a report with findings and their limits, as the calibration check writes it, got /,
    );
  });

  it('draws the image without anything beside it', () => {
    const { image, profile } = drawAll({ image: inputs.image }, ['image', 'profile']);
    expect(rasters(image)).toHaveLength(2); // the picture and the colour bar
    expect(profile).not.toContain('68 %');
  });

  it('says how many draws have a ring', () => {
    expect(drawn.posterior).toContain('64 draws; ring measured in 16, found in 16; bias not corrected');
  });

  it('draws the rings that features measured, when it is given their report', () => {
    const measures = Array.from({ length: 40 }, (_, k) => ({
      diameter: 977 + k,
      width: k < 20 ? null : 10,
      asymmetry: 0.2,
      positionAngle: (350 + k) % 360,
      centralDepression: 0.1,
    }));
    const report = (draws: number) => file('features', (sink) => writeJson(sink, { draws, measures }));
    const { posterior } = drawAll({ ...inputs, features: report(50) }, ['posterior']);
    expect(posterior).toContain('64 draws; ring measured in 50, found in 40');
    // Ticks of diameters from 977 to 1016 uas, which no draw of the samples has; the angles in one piece about north.
    expect(posterior).toMatch(/aria-label="1\D?000"/);
    const few = drawAll({ ...inputs, features: report(90) }, ['posterior']).posterior;
    expect(few).toContain('a ring in 40 of 90 looked at, too few to show');
    const none = file('features', (sink) => writeJson(sink, { draws: 3 }));
    expect(() => drawAll({ ...inputs, features: none }, ['posterior'])).toThrow(
      /^features, measures: wrong-document: expected the output `report` of a stage of kind features, got /,
    );
  });

  it('refuses draws of another basis', () => {
    const smaller = file('basis', (sink) => writeBasis(sink, inventedBasis(3)));
    expect(() => drawAll({ ...inputs, basis: smaller }, ['posterior'])).toThrow(
      'samples: wrong-basis: expected draws with at most the 3 components of the basis, got 64 draws of 8 components. ' +
        'Give the samples and the basis of one fit.',
    );
  });

  it('refuses residuals with lists of unlike length, without errors, or of unknown triangles', () => {
    const good = inventedResiduals(visibilities, model);
    const draw = (residuals: unknown) => () =>
      drawAll({ residuals: file('residuals', (sink) => writeJson(sink, residuals)) }, ['data']);
    const cut = { ...good, visibilities: { ...good.visibilities, v: good.visibilities.v.slice(1) } };
    const n = good.visibilities.u.length;
    expect(draw(cut)).toThrow(
      `residuals, visibilities.v: bad-residuals: expected ${n} values, as there are errors, got ${n - 1}. ` +
        'Give the output residuals of a fit.',
    );
    const zero = {
      ...good,
      visibilities: { ...good.visibilities, sigma: good.visibilities.sigma.map((s, k) => (k === 2 ? 0 : s)) },
    };
    expect(draw(zero)).toThrow(
      'residuals, visibilities, error 2: bad-residuals: expected an error above 0, got 0.',
    );
    const stations = good.closurePhases.stations.map((triangle, k) => (k === 1 ? [0, 1, 77] : triangle));
    expect(draw({ ...good, closurePhases: { ...good.closurePhases, stations } })).toThrow(
      'residuals, closurePhases.stations.1: bad-residuals: expected three stations whose baselines are among the ' +
        'visibilities of the scan, got [0,1,77].',
    );
    expect(draw({})).toThrow(
      'residuals, stations: wrong-document: expected residuals as fit writes them, got',
    );
  });
});
