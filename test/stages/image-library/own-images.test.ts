import fc from 'fast-check';
import { expect, test } from 'vitest';
import { drawOwnImage, placementsOf } from '../../../stages/image-library/own-images.ts';
import { offset, UAS } from '../numerics/direct-sums.ts';
import { families, imageFile, makeLibrary } from './library-task.ts';

const grid = { nx: 40, ny: 40, pixelRadians: 2 * UAS };

/** Flux, centroid and second moments, about the centre of the array, uas. */
function momentsOf(shape: typeof grid, pixels: Float64Array) {
  let [flux, east, north, xx, xy, yy] = [0, 0, 0, 0, 0, 0];
  pixels.forEach((value, k) => {
    const { x, y } = offset(shape, k % shape.nx, Math.floor(k / shape.nx));
    flux += value;
    east += (value * x) / UAS;
    north += (value * y) / UAS;
    xx += (value * x * x) / UAS / UAS;
    xy += (value * x * y) / UAS / UAS;
    yy += (value * y * y) / UAS / UAS;
  });
  return { flux, east, north, xx, xy, yy };
}

function draw(image: Parameters<typeof drawOwnImage>[2], turn: number, scale: number): Float64Array {
  const pixels = new Float64Array(grid.nx * grid.ny);
  drawOwnImage(pixels, grid, image, { turn, scale }, 'images, plane 1');
  return pixels;
}

const images = fc
  .record({
    nx: fc.integer({ min: 2, max: 9 }),
    ny: fc.integer({ min: 2, max: 9 }),
    pixel: fc.double({ min: 0.3, max: 5, noNaN: true }),
    values: fc.array(fc.double({ min: 0, max: 3, noNaN: true }), { minLength: 81, maxLength: 81 }),
  })
  .map(({ nx, ny, pixel, values }) => ({
    nx,
    ny,
    pixelRadians: pixel * UAS,
    pixels: Float64Array.from(values.slice(0, nx * ny), (value) => value + 0.01),
  }));

test('keeps flux and centroid whatever the turn and scale', () => {
  const turns = fc.double({ min: 0, max: 7, noNaN: true });
  const scales = fc.double({ min: 0.5, max: 1.2, noNaN: true });
  fc.assert(
    fc.property(images, turns, scales, (image, turn, scale) => {
      const { flux, east, north } = momentsOf(grid, draw(image, turn, scale));
      expect(Math.abs(flux - 1)).toBeLessThan(1e-12);
      expect(Math.abs(east) + Math.abs(north)).toBeLessThan(1e-10);
    }),
    { numRuns: 50 },
  );
});

test('turns north to east by 90 degrees, and scales lengths', () => {
  // Two points 16 uas apart on a north-south line: the second moment is 8^2, and 16^2 at twice the size. Sharing
  // among pixels, and the square shape of a piece, add up to 2^2 / 4 + 2^2 / 12 uas^2, scaled by the pixels' own size.
  const pixels = new Float64Array(3 * 9);
  pixels[1] = 1;
  pixels[3 * 8 + 1] = 1;
  const image = { nx: 3, ny: 9, pixelRadians: 2 * UAS, pixels };
  const upright = momentsOf(grid, draw(image, 0, 1));
  expect(Math.abs(upright.yy - 64)).toBeLessThan(2);
  expect(upright.xx).toBeLessThan(2);
  const turned = momentsOf(grid, draw(image, Math.PI / 2, 2));
  expect(Math.abs(turned.xx - 256)).toBeLessThan(4);
  expect(turned.yy).toBeLessThan(4);
  // Between north and east x and y rise together.
  expect(momentsOf(grid, draw(image, Math.PI / 4, 1)).xy).toBeGreaterThan(30);
});

test('shows no gaps when pixels are magnified', () => {
  const flat = { nx: 4, ny: 4, pixelRadians: 10 * UAS, pixels: new Float64Array(16).fill(1) };
  const pixels = draw(flat, 0.3, 1);
  // Inside the square of 40 uas every pixel of 2 uas holds (2/40)^2 of the flux; sharing leaves a grain.
  for (let j = 16; j < 24; j++) {
    for (let i = 16; i < 24; i++) expect((pixels[j * 40 + i] as number) * 400).toBeCloseTo(1, 1);
  }
});

test('places the first copy as it is and the others at random, the same for the same seed', () => {
  const placements = placementsOf(30, [0.8, 1.25], 4, '0 0');
  expect(placements[0]).toEqual({ turn: 0, scale: 1 });
  expect(placementsOf(30, [0.8, 1.25], 4, '0 0')).toEqual(placements);
  expect(placementsOf(30, [0.8, 1.25], 5, '0 0')).not.toEqual(placements);
  expect(placementsOf(30, [0.8, 1.25], 4, '0 1')).not.toEqual(placements);
  for (const { scale } of placements) expect(scale >= 0.8 && scale < 1.25).toBe(true);
  expect(new Set(placements.map(({ turn }) => Math.floor(turn / (Math.PI / 2)))).size).toBe(4);
});

test('adds own images to the library after the families', () => {
  const pixels = new Float64Array(100);
  pixels[34] = 5;
  const own = imageFile(10, 10, 4 * UAS, pixels);
  const { cube, manifest } = makeLibrary({ families: families({ bar: 1 }), copies: 3 }, [own, own]);
  expect(manifest.families).toEqual({ bar: 1, own: 6 });
  expect(cube.count).toBe(7);
  expect(manifest.images[1]).toEqual({
    image: 1,
    family: 'own',
    parameters: { input: 0, plane: 0, turn: 0, scale: 1 },
  });
  expect(manifest.images[6]?.parameters.input).toBe(1);
  const { flux, east, north } = momentsOf({ nx: 64, ny: 64, pixelRadians: 2.5 * UAS }, cube.plane(1));
  expect(flux).toBeCloseTo(1, 6);
  expect(Math.abs(east) + Math.abs(north)).toBeLessThan(1e-5);
});

test('refuses an own image without flux, and one larger than the field', () => {
  const none = families({});
  expect(() => makeLibrary({ families: none }, [imageFile(2, 2, UAS, new Float64Array(4))])).toThrow(
    'images, plane 1: no-flux: expected an image of positive total flux, got 0. Leave this image out, or give its ' +
      'total intensity.',
  );
  const wide = imageFile(10, 10, 20 * UAS, new Float64Array(100).fill(1));
  expect(() => makeLibrary({ families: none, copies: 1 }, [wide])).toThrow(
    /^images, plane 1: beyond-field: expected at least 98 % of the flux within the field, got 6\d\.\d %\. Enlarge the field, or narrow copyScale\.$/,
  );
});
