/** The generated part of a library: random images of the families that the recipe asks for, one after the other. Each
 *  image has its own stream of random numbers, named after its family and its number there, so asking for more
 *  images of one family changes none of the others. */

import { makeDrawing, softened } from '../numerics/draw.ts';
import type { PixelGrid } from '../numerics/fourier.ts';
import { centredModel, type Model, type ModelPart } from '../numerics/models.ts';
import { randomStream } from '../numerics/random.ts';
import { InputProblem } from '../problem.ts';
import { FAMILIES, type FamilyName, type SizeRange } from './families.ts';
import { buildModel, type SizeDraw } from './family-models.ts';

export const UAS = Math.PI / 180 / 3600 / 1e6;
const DEGREE = Math.PI / 180;

/** What the recipe says of a family: `count`, and a pair [low, high] for every range, in the range's unit. */
export type FamilyRequest = { readonly count: number } & { readonly [range: string]: unknown };
export type FamilyRequests = Readonly<Record<FamilyName, FamilyRequest>>;

export interface LibraryImage {
  readonly family: string;
  /** As drawn, in the units of families.ts; angles in degrees. A list where an image has several of one name. */
  readonly parameters: Readonly<Record<string, number | readonly number[]>>;
  /** Valid until the next image is drawn. */
  readonly pixels: Float64Array;
}

/** Number of images asked for. */
export function countRequested(requests: FamilyRequests): number {
  return familyNames().reduce((sum, name) => sum + requests[name].count, 0);
}

export function familyNames(): FamilyName[] {
  return Object.keys(FAMILIES) as FamilyName[];
}

/** Draws the images, family after family in the order of families.ts.
 *  @throws InputProblem when a range is upside down or an image reaches beyond the field */
export function* generateImages(
  requests: FamilyRequests,
  grid: PixelGrid,
  seed: number,
): Generator<LibraryImage> {
  for (const family of familyNames()) requireRanges(family, requests[family]);
  const draw = makeDrawing(grid);
  const pixels = new Float64Array(grid.nx * grid.ny);
  for (const family of familyNames()) {
    for (let k = 0; k < requests[family].count; k++) {
      const { model, parameters } = randomModel(family, requests[family], seed, k);
      const image = softened(centredModel(model), grid.pixelRadians);
      requireInside(image, grid, family, k);
      draw(pixels, image);
      yield { family, parameters, pixels };
    }
  }
}

/** The model of image k of a family, before it is centred and softened, and what was drawn for it. */
export function randomModel(
  family: FamilyName,
  request: FamilyRequest,
  seed: number,
  k: number,
): { model: Model; parameters: Record<string, number | readonly number[]> } {
  const random = randomStream(seed, `image-library ${family} ${k}`);
  const drawn: Record<string, number[]> = {};
  const keep = (name: string, value: number) => {
    const values = drawn[name] ?? [];
    values.push(value);
    drawn[name] = values;
  };
  const draw: SizeDraw = {
    uniform: random.uniform,
    size(name) {
      const [low, high] = request[name] as [number, number];
      const value = random.between(low, high);
      keep(name, value);
      return value * unitOf((FAMILIES[family].ranges as Record<string, SizeRange>)[name]);
    },
    sign(name) {
      const value = random.uniform() < 0.5 ? -1 : 1;
      keep(name, value);
      return value;
    },
    angle(name) {
      const value = random.between(0, 360);
      keep(name, value);
      return value * DEGREE;
    },
  };
  const model = buildModel[family](draw);
  const parameters = Object.entries(drawn).map(([name, values]) => [
    name,
    values.length === 1 ? (values[0] as number) : values,
  ]);
  return { model, parameters: Object.fromEntries(parameters) };
}

function unitOf(range: SizeRange | undefined): number {
  if (range?.unit === 'uas') return UAS;
  return range?.unit === 'deg' ? DEGREE : 1;
}

function requireRanges(family: FamilyName, request: FamilyRequest): void {
  for (const [name, { unit }] of Object.entries(FAMILIES[family].ranges as Record<string, SizeRange>)) {
    const [low, high] = request[name] as [number, number];
    if (low <= high) continue;
    throw new InputProblem({
      code: 'bad-range',
      place: `parameter families.${family}.${name}`,
      expected: 'the lower limit first',
      found: `[${low}, ${high}] ${unit}`.trim(),
      advice: 'Exchange the two.',
    });
  }
}

/** An image reaches as far as its parts' edges and one full width of the blur; a Gaussian, with the blur in it, to 1.5
 *  of its full widths (0.2 % of its flux lies beyond). */
function requireInside(model: Model, grid: PixelGrid, family: string, k: number): void {
  const reach = Math.max(...model.parts.map((part) => reachOfPart(part, model.blur)));
  const half = (Math.min(grid.nx, grid.ny) * grid.pixelRadians) / 2;
  if (reach <= half) return;
  throw new InputProblem({
    code: 'beyond-field',
    place: `parameter families.${family}, image ${k} of the family`,
    expected: `images within ${toUas(half)} uas of their centroid, half the field`,
    found: `one that reaches to ${toUas(reach)} uas`,
    advice: 'Enlarge the field, or narrow the ranges of this family, or set its count to 0.',
  });
}

function reachOfPart({ shape, x, y, length, breadth }: ModelPart, blur: number): number {
  const larger = Math.max(length, breadth);
  const own = {
    point: blur,
    gaussian: 1.5 * Math.sqrt(larger * larger + blur * blur),
    disc: larger / 2 + blur,
    ring: larger / 2 + blur,
    box: Math.sqrt(length * length + breadth * breadth) / 2 + blur,
  }[shape];
  return Math.sqrt(x * x + y * y) + own;
}

function toUas(radians: number): string {
  return (radians / UAS).toFixed(1);
}
