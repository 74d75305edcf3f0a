import { expect, test } from 'vitest';
import { FAMILIES } from '../../../stages/image-library/families.ts';
import { randomModel } from '../../../stages/image-library/generate.ts';
import { imageLibrary } from '../../../stages/image-library/image-library.ts';
import { softened } from '../../../stages/numerics/draw.ts';
import { centredModel, visibilitiesOfModel } from '../../../stages/numerics/models.ts';
import { blurredRing, double, ellipticalGaussian } from '../../../stages/numerics/named-models.ts';
import { defaultParameters } from '../default-parameters.ts';
import { directVisibility, offset, UAS } from '../numerics/direct-sums.ts';
import { families, makeLibrary } from './library-task.ts';

const twoOfEach = Object.fromEntries(Object.keys(FAMILIES).map((name) => [name, 2]));
const small = makeLibrary({ families: families(twoOfEach) });

test('declares 3,000 images, the larger part of which are no rings with a dark centre', () => {
  const counts = Object.entries(FAMILIES).map(([name, { count }]) => ({ name, count }));
  expect(counts.reduce((sum, { count }) => sum + count, 0)).toBe(3000);
  const dark = ['ring', 'crescent', 'elliptical-ring', 'ring-with-spot'];
  const rings = counts.filter(({ name }) => dark.includes(name)).reduce((sum, { count }) => sum + count, 0);
  expect(rings).toBeLessThan(1500);
  // The table of a basis gives a family's name 24 characters: CONVENTIONS.
  for (const { name } of counts) expect(name.length).toBeLessThanOrEqual(24);
});

test('resolves its defaults', () => {
  const parameters = defaultParameters(imageLibrary) as { families: { ring: unknown }; field: number };
  expect(parameters.field).toBeCloseTo(160, 12);
  expect(parameters.families.ring).toEqual({
    count: 300,
    diameter: [20, 75],
    width: [5, 20],
    asymmetry: [0, 0.45],
  });
});

test('makes images of unit flux with their centroid at the origin', () => {
  const { cube } = small;
  expect(cube.count).toBe(2 * Object.keys(FAMILIES).length);
  for (let k = 0; k < cube.count; k++) {
    let [flux, east, north] = [0, 0, 0];
    cube.plane(k).forEach((value, at) => {
      const { x, y } = offset(cube, at % 64, Math.floor(at / 64));
      flux += value;
      east += value * x;
      north += value * y;
    });
    // Single precision holds 6e-8 of each pixel. Flux across the edge of the field moves a centroid.
    expect(Math.abs(flux - 1)).toBeLessThan(1e-6);
    expect(Math.abs(east) + Math.abs(north)).toBeLessThan(0.02 * UAS);
  }
});

test('lists every image with its family and what was drawn for it', () => {
  const { manifest } = small;
  expect(manifest.count).toBe(manifest.images.length);
  expect(manifest.families).toEqual(twoOfEach);
  expect(manifest.softeningUas).toBe(5);
  manifest.images.forEach(({ image, family, parameters }, k) => {
    expect(image).toBe(k);
    const { ranges } = FAMILIES[family as keyof typeof FAMILIES];
    for (const [name, { low, high }] of Object.entries(
      ranges as Record<string, { low: number; high: number }>,
    )) {
      for (const value of [parameters[name]].flat() as number[]) {
        expect(value).toBeGreaterThanOrEqual(low);
        expect(value).toBeLessThanOrEqual(high);
      }
    }
  });
});

test('draws what the manifest says', () => {
  const { cube, manifest } = small;
  const degree = Math.PI / 180;
  const built = manifest.images.flatMap(({ image, family, parameters: p }) => {
    const at = (name: string) => p[name] as number;
    if (family === 'ring') {
      const ring = blurredRing(
        at('diameter') * UAS,
        at('width') * UAS,
        at('asymmetry'),
        at('brightest') * degree,
      );
      return [{ image, model: ring }];
    }
    if (family !== 'gaussian') return [];
    const gaussian = ellipticalGaussian(
      at('width') * UAS,
      at('width') * at('axisRatio') * UAS,
      at('axis') * degree,
    );
    return [{ image, model: gaussian }];
  });
  expect(built).toHaveLength(4);
  for (const { image, model } of built) {
    const [re, im] = [new Float64Array(1), new Float64Array(1)];
    for (const [k, l] of [
      [1, 0],
      [2, -3],
      [0, 7],
    ] as const) {
      const [u, v] = [k / (160 * UAS), l / (160 * UAS)];
      visibilitiesOfModel(
        re,
        im,
        softened(centredModel(model), 2.5 * UAS),
        Float64Array.of(u),
        Float64Array.of(v),
      );
      const [foundRe, foundIm] = directVisibility(cube, cube.plane(image), u, v);
      expect(Math.abs(foundRe - (re[0] as number))).toBeLessThan(1e-6);
      expect(Math.abs(foundIm - (im[0] as number))).toBeLessThan(1e-6);
    }
  }
});

test('gives the same bytes for the same seed, others for another', () => {
  const wanted = { families: families({ clumps: 3, spiral: 2 }) };
  const one = makeLibrary(wanted);
  const again = makeLibrary(wanted);
  expect(Buffer.compare(again.images, one.images)).toBe(0);
  expect(Buffer.compare(again.manifestBytes, one.manifestBytes)).toBe(0);
  expect(Buffer.compare(makeLibrary({ ...wanted, seed: 2 }).images, one.images)).not.toBe(0);
});

test('leaves the other images as they are when a family grows', () => {
  const one = makeLibrary({ families: families({ ring: 1, bar: 1 }) });
  const more = makeLibrary({ families: families({ ring: 3, bar: 1 }) });
  expect(more.cube.plane(0)).toEqual(one.cube.plane(0));
  expect(more.cube.plane(3)).toEqual(one.cube.plane(1));
});

test('turns images over the whole circle', () => {
  const request = families({ double: 1 }).double as { count: number };
  const quadrants = new Set<number>();
  for (let k = 0; k < 40; k++) {
    const { parameters, model } = randomModel('double', request, 1, k);
    const angle = parameters.axis as number;
    quadrants.add(Math.floor(angle / 90));
    const { x, y } = double(1, Math.sin((angle * Math.PI) / 180), Math.cos((angle * Math.PI) / 180))
      .parts[1] ?? {
      x: Number.NaN,
      y: Number.NaN,
    };
    expect(Math.sign(model.parts[1]?.x ?? 0)).toBe(Math.sign(x));
    expect(Math.sign(model.parts[1]?.y ?? 0)).toBe(Math.sign(y));
  }
  expect(quadrants.size).toBe(4);
});

test('refuses a range upside down', () => {
  const upsideDown = families({ ring: { count: 1, diameter: [50, 40] } });
  expect(() => makeLibrary({ families: upsideDown })).toThrow(
    'parameter families.ring.diameter: bad-range: expected the lower limit first, got [50, 40] uas. Exchange the two.',
  );
  expect(() => makeLibrary({ families: families({ ring: 1 }), copyScale: [2, 1] })).toThrow(
    'parameter copyScale: bad-range: expected the lower limit first, got [2, 1]. Exchange the two.',
  );
});

test('refuses an image that reaches beyond the field', () => {
  const large = families({ disc: { count: 1, diameter: [100, 100] } });
  expect(() => makeLibrary({ families: large, field: 100, pixels: 40 })).toThrow(
    'parameter families.disc, image 0 of the family: beyond-field: expected images within 50.0 uas of their ' +
      'centroid, half the field, got one that reaches to 55.0 uas. Enlarge the field, or narrow the ranges of this ' +
      'family, or set its count to 0.',
  );
});

test('refuses a library of no images', () => {
  expect(() => makeLibrary({ families: families({}) })).toThrow(
    'parameter families: no-images: expected at least one image, got a count of 0 for every family, and no own ' +
      'images. Set the count of a family, or give the input images.',
  );
});
