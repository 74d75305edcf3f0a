import { beforeAll, describe, expect, test } from 'vitest';
import { basisBuild } from '../../../stages/basis-build/basis-build.ts';
import { buildBasis, isHeldOut, type Projection, TAPER_CUT } from '../../../stages/basis-build/build.ts';
import { compute } from '../../../stages/basis-build/compute.ts';
import { type Library, withUnitFlux } from '../../../stages/basis-build/library.ts';
import { makeTally } from '../../../stages/basis-build/tally.ts';
import { memorySink, sourceOf } from '../../../stages/bytes.ts';
import type { Basis } from '../../../stages/data.ts';
import { readBasis } from '../../../stages/formats/basis.ts';
import { readJson } from '../../../stages/formats/json.ts';
import { startSkyCube } from '../../../stages/formats/sky-image.ts';
import { makeModes } from '../../../stages/numerics/band-limit.ts';
import { makeMomentSum, principalComponents } from '../../../stages/numerics/components.ts';
import { defaultParameters } from '../default-parameters.ts';
import { families, type MadeLibrary, makeLibrary } from '../image-library/library-task.ts';
import { dot, largestDifference, someNumbers, UAS } from '../numerics/direct-sums.ts';

const grid = { nx: 13, ny: 11, pixelRadians: 5 * UAS };
const size = grid.nx * grid.ny;

/** A library in memory: positive noise, no two images alike. */
function noiseLibrary(count: number): Library {
  return {
    ...grid,
    count,
    families: Array.from({ length: count }, (_, k) => (k % 2 === 0 ? 'even' : 'odd')),
    image: (k) =>
      withUnitFlux(
        someNumbers(size, k + 1).map((value) => value + 2),
        `image ${k}`,
      ),
  };
}

function build(library: Library, overrides: Partial<Parameters<typeof buildBasis>[1]> = {}) {
  const seen: Projection[] = [];
  const options = { components: 5, resolutionRadians: 12 * UAS, heldOut: 0, ...overrides };
  const made = buildBasis(library, options, (each) => {
    seen.push({ ...each, scores: each.scores.slice() });
  });
  return { ...made, seen };
}

/** The image that the basis sees: tapered, without the frequencies that the cut leaves out. */
function bandLimited(library: Library, k: number, resolution: number): Float64Array {
  const modes = makeModes(grid, resolution, TAPER_CUT);
  const row = new Float64Array(modes.count);
  modes.project(row, library.image(k));
  const pixels = new Float64Array(size);
  modes.synthesize(pixels, row, 1);
  return pixels;
}

test('equals the principal components of all band-limited images at once, pixel by pixel', () => {
  const library = noiseLibrary(60);
  const sum = makeMomentSum(size);
  for (let k = 0; k < 60; k++) sum.add(bandLimited(library, k, 12 * UAS));
  const moments = sum.finish();
  const wanted = principalComponents(moments, 5);
  const { basis } = build(library);
  expect(largestDifference(basis.mean, moments.mean)).toBeLessThan(1e-15);
  expect(Math.abs(basis.totalVariance / wanted.totalVariance - 1)).toBeLessThan(1e-12);
  wanted.vectors.forEach((vector, k) => {
    expect(Math.abs((basis.eigenvalues[k] as number) / (wanted.eigenvalues[k] as number) - 1)).toBeLessThan(
      1e-10,
    );
    expect(Math.abs(Math.abs(dot(vector, basis.components[k] as Float64Array)) - 1)).toBeLessThan(1e-9);
  });
});

test('brings images to unit flux', () => {
  expect(withUnitFlux(Float64Array.of(1, -2, 5), 'x')).toEqual(Float64Array.of(0.25, -0.5, 1.25));
});

test('gives orthonormal components that sum to 0, their largest pixel positive, and a mean that sums to 1', () => {
  const { basis } = build(noiseLibrary(40));
  const sum = (values: Float64Array) => values.reduce((total, value) => total + value, 0);
  expect(sum(basis.mean)).toBeCloseTo(1, 13);
  basis.components.forEach((a, k) => {
    expect(Math.abs(sum(a))).toBeLessThan(1e-13);
    expect(Math.max(...a)).toBe(Math.max(...a.map(Math.abs)));
    basis.components.forEach((b, m) => {
      expect(Math.abs(dot(a, b) - (k === m ? 1 : 0))).toBeLessThan(1e-13);
    });
  });
});

test('gives scores of mean 0 whose variances are the eigenvalues, and that rebuild the images', () => {
  const library = noiseLibrary(40);
  const { basis } = build(library);
  const K = basis.components.length;
  const score = (image: number, k: number) => basis.scores[image * K + k] as number;
  for (let k = 0; k < K; k++) {
    const column = Float64Array.from({ length: 40 }, (_, image) => score(image, k));
    expect(Math.abs(column.reduce((total, value) => total + value, 0))).toBeLessThan(1e-13);
    expect(dot(column, column) / 39 / (basis.eigenvalues[k] as number)).toBeCloseTo(1, 10);
    const deviation = bandLimited(library, 7, 12 * UAS).map(
      (value, at) => value - (basis.mean[at] as number),
    );
    expect(Math.abs(dot(deviation, basis.components[k] as Float64Array) - score(7, k))).toBeLessThan(1e-14);
  }
});

test('leaves (n-1)/n of the eigenvalues left out as the mean square of reconstruction', () => {
  // Eckart and Young 1936; Golub and Van Loan, Matrix Computations, 4th ed., theorem 2.4.8.
  const { basis, seen } = build(noiseLibrary(50));
  const left = seen.reduce((sum, each) => sum + each.deviation - dot(each.scores, each.scores), 0);
  const kept = basis.eigenvalues.reduce((sum, value) => sum + value, 0);
  expect(left / 50 / ((49 / 50) * (basis.totalVariance - kept))).toBeCloseTo(1, 10);
});

test('gives the same bits whatever the size of a block', () => {
  const library = noiseLibrary(45);
  const { basis } = build(library, { blockRows: 1 });
  for (const blockRows of [7, 32, 64]) expect(build(library, { blockRows }).basis).toEqual(basis);
});

test('finds a library of known rank whole', () => {
  // Images are a mean and three patterns within the band limit, with weights that differ.
  const modes = makeModes(grid, 12 * UAS, TAPER_CUT);
  const patterns = [0, 5, 9].map((m) => {
    const pixels = new Float64Array(size);
    modes.synthesize(
      pixels,
      Float64Array.from({ length: modes.count }, (_, k) => (k === m ? 0.02 : 0)),
      0,
    );
    return pixels;
  });
  const image = (k: number) => {
    const weights = someNumbers(3, k + 1);
    const pixels = new Float64Array(size).fill(1 / size);
    patterns.forEach((pattern, m) => {
      pattern.forEach((value, at) => {
        pixels[at] = (pixels[at] as number) + (weights[m] as number) * value;
      });
    });
    return pixels;
  };
  const library: Library = { ...grid, count: 30, families: new Array(30).fill('made'), image };
  const { basis, seen } = build(library, { components: 3, heldOut: 0.2 });
  const explained = basis.eigenvalues.reduce((sum, value) => sum + value, 0) / basis.totalVariance;
  expect(explained).toBeCloseTo(1, 12);
  for (const { deviation, scores } of seen)
    expect(Math.abs(deviation - dot(scores, scores))).toBeLessThan(1e-15);
  expect(() => build(library, { components: 4 })).toThrow(
    'parameter components: too-many-components: expected at most 3: at this resolution the 30 images differ in no ' +
      'more directions than that, got 4. Ask for fewer components, or give more varied images.',
  );
});

test('holds the stated part of the images out, evenly', () => {
  const held = Array.from({ length: 20 }, (_, k) => k).filter((k) => isHeldOut(k, 0.1));
  expect(held).toEqual([9, 19]);
  expect(Array.from({ length: 20 }, (_, k) => k).some((k) => isHeldOut(k, 0))).toBe(false);
  const library = noiseLibrary(40);
  const { basis, seen } = build(library, { heldOut: 0.25 });
  expect(basis.families).toHaveLength(30);
  expect(seen.filter(({ heldOut }) => heldOut).map(({ image }) => image)).toEqual([
    3, 7, 11, 15, 19, 23, 27, 31, 35, 39,
  ]);
  // An image that is held out has no part in the basis.
  const other: Library = {
    ...library,
    image: (k) =>
      k === 7
        ? withUnitFlux(
            new Float64Array(size).map((_, at) => at),
            'image 7',
          )
        : library.image(k),
  };
  expect(build(other, { heldOut: 0.25 }).basis).toEqual(basis);
});

test('tallies errors of held-out images by family', () => {
  const tally = makeTally(2);
  const image = { heldOut: true, square: 4, deviation: 2 };
  tally.add({ ...image, image: 0, scores: Float64Array.of(1, 0) }, 'ring');
  tally.add({ ...image, image: 1, scores: Float64Array.of(1, 1) }, 'ring');
  tally.add({ ...image, image: 2, heldOut: false, scores: Float64Array.of(0, 0) }, 'disc');
  expect(tally.families()).toEqual([
    { family: 'ring', images: 2, medianError: 0.25, worstError: 0.5, worstImage: 0 },
  ]);
  expect(tally.heldOutExplained()).toEqual([0.5, 0.75]);
  expect(makeTally(2).heldOutExplained()).toEqual([]);
});

test('refuses more components than images or frequencies, and too fine a resolution', () => {
  expect(() => build(noiseLibrary(6), { components: 6 })).toThrow(
    'parameter components: too-many-components: expected fewer components than the 6 images in the basis, got 6. ' +
      'Ask for fewer components, or give more images.',
  );
  expect(() => build(noiseLibrary(6), { resolutionRadians: 60 * UAS })).toThrow(
    'parameter components: too-many-components: expected at most 4, the frequencies within the field at this ' +
      'resolution, got 5. Ask for fewer components or a finer resolution.',
  );
  const large: Library = { ...noiseLibrary(6), nx: 80, ny: 80 };
  expect(() => build(large, { resolutionRadians: 0 })).toThrow(
    'parameter resolution: too-many-modes: expected at most 4000 frequencies within the field at this resolution, ' +
      'got 6240. Give a coarser resolution, or make the library with a smaller field or fewer pixels.',
  );
});

function runStage(cube: Uint8Array, manifest: Uint8Array, overrides: Record<string, unknown> = {}) {
  const basis = memorySink();
  const report = memorySink();
  compute({
    inputs: { library: [sourceOf(cube, 'library')], manifest: [sourceOf(manifest, 'manifest')] },
    parameters: { ...defaultParameters(basisBuild), ...overrides },
    outputs: { basis, report },
    note: () => {},
    progress: () => {},
  });
  return { basis: basis.bytes(), report: readJson(sourceOf(report.bytes())) as Record<string, unknown> };
}

describe('of files', () => {
  let library: MadeLibrary;
  let made: ReturnType<typeof runStage>;
  let basis: Basis;
  const wanted = { ring: 40, gaussian: 30, double: 30 };

  beforeAll(() => {
    library = makeLibrary({ pixels: 32, families: families(wanted) });
    made = runStage(library.images, library.manifestBytes, { components: 12 });
    basis = readBasis(sourceOf(made.basis));
  });

  test('writes a basis that reads back', () => {
    expect(basis.components).toHaveLength(12);
    expect(basis.resolutionRadians / UAS).toBeCloseTo(12, 9);
    expect(basis.pixelRadians / UAS).toBeCloseTo(5, 9);
    expect(basis.scores).toHaveLength(90 * 12);
    expect(new Set(basis.families)).toEqual(new Set(['ring', 'gaussian', 'double']));
  });

  test('reports explained variance and errors of what was held out', () => {
    const { report } = made;
    expect(report).toMatchObject({
      images: 100,
      inBasis: 90,
      heldOut: 10,
      resolutionUas: 12,
      components: 12,
    });
    const explained = report.explained as number[];
    expect(explained).toHaveLength(12);
    expect(explained.toSorted((a, b) => a - b)).toEqual(explained);
    expect(explained[11]).toBeGreaterThan(0.9);
    expect(explained[11]).toBeLessThan(1);
    const held = report.heldOutFamilies as { family: string; images: number; medianError: number }[];
    expect(held.map(({ family, images }) => [family, images])).toEqual([
      ['ring', 4],
      ['gaussian', 3],
      ['double', 3],
    ]);
    for (const { medianError } of held) expect(medianError > 0 && medianError < 0.3).toBe(true);
  });

  test('gives the same bytes again', () => {
    const again = runStage(library.images, library.manifestBytes, { components: 12 });
    expect(Buffer.compare(again.basis, made.basis)).toBe(0);
  });

  test('refuses a manifest of another library', () => {
    const other = makeLibrary({ pixels: 32, families: families({ ring: 3 }) });
    expect(() => runStage(library.images, other.manifestBytes)).toThrow(
      'manifest: wrong-count: expected 100 images, as many as library has planes, got 3. Give the manifest of this ' +
        'very library.',
    );
    const text = (value: unknown) => new TextEncoder().encode(JSON.stringify(value));
    expect(() => runStage(library.images, text({ images: [{ family: '' }] }))).toThrow(
      /^manifest, images\.0\.family: wrong-document: expected a list images, each with its family, a text of 1 to 24 characters, got .*\. Give the manifest that image-library wrote\.$/,
    );
  });

  test('names the plane of an image without flux', () => {
    const sink = memorySink();
    const cube = startSkyCube(sink, { ...grid, count: 3 });
    for (let k = 0; k < 3; k++) cube.plane(new Float64Array(size).map((_, at) => (k === 1 ? 0 : at)));
    cube.end();
    const manifest = { images: [{ family: 'a' }, { family: 'a' }, { family: 'a' }] };
    const bytes = new TextEncoder().encode(JSON.stringify(manifest));
    expect(() => runStage(sink.bytes(), bytes, { components: 1, heldOut: 0 })).toThrow(
      'library, plane 2: no-flux: expected finite pixels with a positive sum, got a sum of 0. Leave this image out of ' +
        'the library, or correct it.',
    );
  });

  test('names the plane and pixel of a value that is not finite', () => {
    const broken = library.images.slice();
    // A NaN in plane 3, pixel (2, 1); the checksums are blanked, as a file without them would be.
    const data = new DataView(broken.buffer);
    data.setFloat32(2880 + 4 * (2 * 32 * 32 + 1), Number.NaN);
    const header = new TextDecoder('latin1').decode(broken.subarray(0, 2880));
    for (const keyword of ['CHECKSUM=', 'DATASUM =']) {
      broken.set(new TextEncoder().encode('COMMENT  '), header.indexOf(keyword));
    }
    expect(() => runStage(broken, library.manifestBytes)).toThrow(
      /^library.*plane 3, pixel \(2, 1\): not-finite: expected a finite value, got NaN\./,
    );
  });
});
