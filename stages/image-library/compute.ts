/** Computation of the kind `image-library`: generated and own images, one after the other, into a cube; what they are
 *  into the manifest. Memory: one image. */

import { writeJson } from '../formats/json.ts';
import { readSkyCube, type SkyCube, startSkyCube } from '../formats/sky-image.ts';
import type { StageReport, StageTask } from '../kind.ts';
import { SOFTENING_PIXELS } from '../numerics/draw.ts';
import type { PixelGrid } from '../numerics/fourier.ts';
import { InputProblem, InternalError } from '../problem.ts';
import {
  countRequested,
  type FamilyRequests,
  familyNames,
  generateImages,
  type LibraryImage,
  UAS,
} from './generate.ts';
import { drawOwnImage, placementsOf } from './own-images.ts';

interface LibraryParameters {
  readonly pixels: number;
  /** uas */
  readonly field: number;
  readonly seed: number;
  readonly families: FamilyRequests;
  readonly copies: number;
  readonly copyScale: readonly [number, number];
}

/** Family of the group's own images in the manifest. */
const OWN = 'own';

/** Images between two reports of progress. */
const PROGRESS_STEP = 50;

/** Makes the library. @throws InputProblem as generateImages and drawOwnImage, and when no image is asked for */
export function compute(task: StageTask): StageReport {
  const parameters = task.parameters as unknown as LibraryParameters;
  const { pixels, field, seed, families, copies } = parameters;
  requireScale(parameters.copyScale);
  const grid: PixelGrid = { nx: pixels, ny: pixels, pixelRadians: (field / pixels) * UAS };
  const own = (task.inputs.images ?? []).map((source) => ({ name: source.name, cube: readSkyCube(source) }));
  const ownCount = own.reduce((sum, { cube }) => sum + cube.count, 0) * copies;
  const count = countRequested(families) + ownCount;
  requireImages(count);
  const cube = startSkyCube(output(task, 'images'), { ...grid, count });
  const list: { image: number; family: string; parameters: LibraryImage['parameters'] }[] = [];
  for (const image of allImages(parameters, grid, own)) {
    cube.plane(image.pixels);
    list.push({ image: list.length, family: image.family, parameters: image.parameters });
    if (list.length % PROGRESS_STEP === 0) task.progress(list.length / count);
  }
  cube.end();
  writeJson(output(task, 'manifest'), {
    count,
    pixels,
    fieldUas: field,
    pixelUas: field / pixels,
    softeningUas: (SOFTENING_PIXELS * field) / pixels,
    seed,
    families: familyCounts(families, ownCount),
    images: list,
  });
  task.note(`library of ${count} images`, { count, own: ownCount });
  return {};
}

function* allImages(
  { families, seed, copies, copyScale }: LibraryParameters,
  grid: PixelGrid,
  own: readonly { readonly name: string; readonly cube: SkyCube }[],
): Generator<LibraryImage> {
  yield* generateImages(families, grid, seed);
  const pixels = new Float64Array(grid.nx * grid.ny);
  for (const [input, { name, cube }] of own.entries()) {
    for (let plane = 0; plane < cube.count; plane++) {
      const image = { ...cube, pixels: cube.plane(plane) };
      for (const placement of placementsOf(copies, copyScale, seed, `${input} ${plane}`)) {
        drawOwnImage(pixels, grid, image, placement, `${name}, plane ${plane + 1}`);
        const turn = (placement.turn * 180) / Math.PI;
        yield { family: OWN, parameters: { input, plane, turn, scale: placement.scale }, pixels };
      }
    }
  }
}

function familyCounts(families: FamilyRequests, ownCount: number): Record<string, number> {
  const counts = familyNames().map((name): [string, number] => [name, families[name].count]);
  return Object.fromEntries([...counts, [OWN, ownCount] as const].filter(([, count]) => count > 0));
}

function output(task: StageTask, name: string) {
  const sink = task.outputs[name];
  if (!sink) throw new InternalError('image-library', `no sink for the output ${name}`);
  return sink;
}

function requireImages(count: number): void {
  if (count > 0) return;
  throw new InputProblem({
    code: 'no-images',
    place: 'parameter families',
    expected: 'at least one image',
    found: 'a count of 0 for every family, and no own images',
    advice: 'Set the count of a family, or give the input images.',
  });
}

function requireScale([smallest, largest]: readonly [number, number]): void {
  if (smallest <= largest) return;
  throw new InputProblem({
    code: 'bad-range',
    place: 'parameter copyScale',
    expected: 'the lower limit first',
    found: `[${smallest}, ${largest}]`,
    advice: 'Exchange the two.',
  });
}
