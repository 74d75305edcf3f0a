/** Runs the kind image-library on sources and sinks in memory. */

import { type ByteSource, memorySink, sourceOf } from '../../../stages/bytes.ts';
import { readJson } from '../../../stages/formats/json.ts';
import { readSkyCube, type SkyCube, writeSkyImage } from '../../../stages/formats/sky-image.ts';
import { compute } from '../../../stages/image-library/compute.ts';
import { FAMILIES } from '../../../stages/image-library/families.ts';
import { imageLibrary } from '../../../stages/image-library/image-library.ts';
import { defaultParameters } from '../default-parameters.ts';

export interface Manifest {
  readonly count: number;
  readonly softeningUas: number;
  readonly families: Record<string, number>;
  readonly images: { image: number; family: string; parameters: Record<string, number> }[];
}

export interface MadeLibrary {
  readonly images: Uint8Array;
  readonly manifestBytes: Uint8Array;
  readonly cube: SkyCube;
  readonly manifest: Manifest;
}

/** Families with the given counts and no others; ranges may be overridden. */
export function families(wanted: Record<string, number | Record<string, unknown>>): Record<string, unknown> {
  const defaults = defaultParameters(imageLibrary).families as Record<string, Record<string, unknown>>;
  return Object.fromEntries(
    Object.keys(FAMILIES).map((name) => {
      const given = wanted[name] ?? 0;
      return [name, { ...defaults[name], ...(typeof given === 'number' ? { count: given } : given) }];
    }),
  );
}

export function makeLibrary(
  overrides: Record<string, unknown>,
  own: readonly ByteSource[] = [],
): MadeLibrary {
  const images = memorySink();
  const manifest = memorySink();
  compute({
    inputs: own.length > 0 ? { images: own } : {},
    parameters: { ...defaultParameters(imageLibrary), ...overrides },
    outputs: { images, manifest },
    note: () => {},
    progress: () => {},
  });
  return {
    images: images.bytes(),
    manifestBytes: manifest.bytes(),
    cube: readSkyCube(sourceOf(images.bytes())),
    manifest: readJson(sourceOf(manifest.bytes())) as Manifest,
  };
}

/** An own image as a file. */
export function imageFile(nx: number, ny: number, pixelRadians: number, pixels: Float64Array): ByteSource {
  const sink = memorySink();
  writeSkyImage(sink, { nx, ny, pixelRadians, pixels });
  return sourceOf(sink.bytes(), 'images');
}
