import fc from 'fast-check';
import { expect, test } from 'vitest';
import { makeDrawing, softened } from '../../../stages/numerics/draw.ts';
import {
  centredModel,
  centroidOfModel,
  fluxOfModel,
  type Model,
  makePart,
  type Shape,
  visibilitiesOfModel,
} from '../../../stages/numerics/models.ts';
import { blurredRing, crescent, curve, polar, squareRing } from '../../../stages/numerics/named-models.ts';
import { directVisibility, offset, UAS } from './direct-sums.ts';

function visibility(model: Model, u: number, v: number): [number, number] {
  const re = new Float64Array(1);
  const im = new Float64Array(1);
  visibilitiesOfModel(re, im, model, Float64Array.of(u), Float64Array.of(v));
  return [re[0] as number, im[0] as number];
}

const models: fc.Arbitrary<Model> = fc.record({
  blur: fc.double({ min: 4 * UAS, max: 15 * UAS, noNaN: true }),
  parts: fc.array(
    fc
      .record({
        shape: fc.constantFrom<Shape>('point', 'gaussian', 'disc', 'ring', 'box'),
        flux: fc.double({ min: 0.1, max: 2, noNaN: true }),
        x: fc.double({ min: -15 * UAS, max: 15 * UAS, noNaN: true }),
        y: fc.double({ min: -15 * UAS, max: 15 * UAS, noNaN: true }),
        length: fc.double({ min: 5 * UAS, max: 40 * UAS, noNaN: true }),
        ratio: fc.double({ min: 0.3, max: 1, noNaN: true }),
        axis: fc.double({ min: 0, max: 7, noNaN: true }),
        asymmetry: fc.double({ min: 0, max: 0.5, noNaN: true }),
        brightest: fc.double({ min: 0, max: 7, noNaN: true }),
      })
      .map(({ shape, ratio, ...fields }) => makePart(shape, { ...fields, breadth: fields.length * ratio })),
    { minLength: 1, maxLength: 3 },
  ),
});

const frequency = fc.double({ min: -8e9, max: 8e9, noNaN: true });

test('gives the flux at the origin and conjugates at mirrored points', () => {
  fc.assert(
    fc.property(models, frequency, frequency, (model, u, v) => {
      expect(visibility(model, 0, 0)[0]).toBeCloseTo(fluxOfModel(model), 12);
      const [re, im] = visibility(model, u, v);
      const [mirroredRe, mirroredIm] = visibility(model, -u, -v);
      expect(mirroredRe).toBeCloseTo(re, 12);
      expect(mirroredIm).toBeCloseTo(-im, 12);
    }),
  );
});

test('has the centroid that the phase near the origin shows', () => {
  // dV/du at the origin is -2 pi i times flux times centroid; the next term of the
  // series is below (2 pi 1e5 40 uas)^2 = 2e-8 of it.
  fc.assert(
    fc.property(models, (model) => {
      const step = 1e5;
      const scale = -2 * Math.PI * fluxOfModel(model) * step;
      const { x, y } = centroidOfModel(model);
      expect(Math.abs(visibility(model, step, 0)[1] / scale - x)).toBeLessThan(1e-4 * UAS);
      expect(Math.abs(visibility(model, 0, step)[1] / scale - y)).toBeLessThan(1e-4 * UAS);
      const centred = centroidOfModel(centredModel(model));
      expect(Math.abs(centred.x) + Math.abs(centred.y)).toBeLessThan(1e-10 * UAS);
      expect(fluxOfModel(centredModel(model))).toBeCloseTo(1, 12);
    }),
  );
});

test('turns with its position angles: a quarter turn takes north to east', () => {
  fc.assert(
    fc.property(models, frequency, frequency, (model, u, v) => {
      const quarter = Math.PI / 2;
      const turned: Model = {
        ...model,
        parts: model.parts.map((part) => ({
          ...part,
          x: part.y,
          y: -part.x,
          axis: part.axis + quarter,
          brightest: part.brightest + quarter,
        })),
      };
      const [re, im] = visibility(model, u, v);
      const [turnedRe, turnedIm] = visibility(turned, v, -u);
      expect(turnedRe).toBeCloseTo(re, 11);
      expect(turnedIm).toBeCloseTo(im, 11);
    }),
  );
});

test.each([
  { nx: 64, ny: 64 },
  { nx: 45, ny: 38 },
])('draws pixels whose visibilities on $nx by $ny pixels are those of the model', ({ nx, ny }) => {
  const grid = { nx, ny, pixelRadians: 2.5 * UAS };
  const draw = makeDrawing(grid);
  const pixels = new Float64Array(nx * ny);
  const columns = fc.integer({ min: -12, max: 12 });
  fc.assert(
    fc.property(models, columns, columns, (model, k, l) => {
      draw(pixels, model);
      const u = k / (nx * grid.pixelRadians);
      const v = l / (ny * grid.pixelRadians);
      const [re, im] = directVisibility(grid, pixels, u, v);
      const [wantedRe, wantedIm] = visibility(model, u, v);
      expect(Math.abs(re - wantedRe)).toBeLessThan(1e-11);
      expect(Math.abs(im - wantedIm)).toBeLessThan(1e-11);
    }),
    { numRuns: 20 },
  );
});

test('draws a Gaussian as its closed form', () => {
  // Brightness of a circular Gaussian times the area of a pixel; what it has beyond the field is 1e-14.
  const grid = { nx: 64, ny: 64, pixelRadians: 2 * UAS };
  const pixels = new Float64Array(64 * 64);
  const sigma = (15 * UAS) / Math.sqrt(8 * Math.LN2);
  const part = makePart('gaussian', { length: 15 * UAS, x: 9 * UAS, y: -6 * UAS });
  makeDrawing(grid)(pixels, { parts: [part], blur: 0 });
  pixels.forEach((value, k) => {
    const { x, y } = offset(grid, k % 64, Math.floor(k / 64));
    const square = (x - 9 * UAS) ** 2 + (y + 6 * UAS) ** 2;
    const wanted =
      (grid.pixelRadians / sigma) ** 2 * (Math.exp(-square / (2 * sigma * sigma)) / (2 * Math.PI));
    expect(Math.abs(value - wanted)).toBeLessThan(1e-12);
  });
});

test('leaves ripples below a hundredth beside softened edges', () => {
  const grid = { nx: 64, ny: 64, pixelRadians: 2.5 * UAS };
  const pixels = new Float64Array(64 * 64);
  for (const model of [crescent(60 * UAS, 30 * UAS, 10 * UAS), squareRing(50 * UAS, 35 * UAS, 0.3)]) {
    makeDrawing(grid)(pixels, softened(centredModel(model), grid.pixelRadians));
    expect(Math.min(...pixels) / Math.max(...pixels)).toBeGreaterThan(-0.01);
  }
});

test('puts the brightest side of a ring at its position angle', () => {
  // Position angle 90 degrees is east, which is the first columns.
  const grid = { nx: 32, ny: 32, pixelRadians: 2.5 * UAS };
  const pixels = new Float64Array(32 * 32);
  makeDrawing(grid)(pixels, blurredRing(30 * UAS, 8 * UAS, 0.4, Math.PI / 2));
  const brightest = pixels.indexOf(Math.max(...pixels));
  expect(brightest % 32).toBeLessThan(12);
  expect(Math.abs(Math.floor(brightest / 32) - 15.5)).toBeLessThan(2);
});

test('places the points of a curve evenly, with unit flux', () => {
  const parts = curve(3, (t) => polar(t, Math.PI / 2));
  expect(parts.map(({ x }) => x)).toEqual([0, 0.5, 1]);
  expect(fluxOfModel({ parts, blur: 0 })).toBeCloseTo(1, 15);
  expect(curve(1, (t) => ({ x: t, y: 0 }))[0]?.x).toBe(0.5);
});

test('refuses lists of unequal length', () => {
  const model = blurredRing(1, 1);
  const one = new Float64Array(1);
  expect(() => visibilitiesOfModel(one, one, model, one, new Float64Array(2))).toThrow(
    '1 points u, 2 v, outputs of 1 and 1',
  );
});
