/** Extensions of files in a bag, by the format that a stage declares, and media types by extension. Media types are those
 *  of the IANA registry. */

import type { Format } from '../../stages/kind.ts';

const EXTENSIONS: Readonly<Record<Format, string>> = {
  'uv-fits': '.uvfits',
  oifits: '.oifits',
  csv: '.csv',
  visibilities: '.oifits',
  'fits-image': '.fits',
  'fits-cube': '.fits',
  'fits-table': '.fits',
  basis: '.fits',
  numbers: '.json',
  json: '.json',
  svg: '.svg',
  file: '',
};

const MEDIA_TYPES: Readonly<Record<string, string>> = {
  uvfits: 'application/fits',
  oifits: 'application/fits',
  fits: 'application/fits',
  csv: 'text/csv',
  json: 'application/json',
  jsonl: 'text/plain',
  svg: 'image/svg+xml',
  png: 'image/png',
  yaml: 'application/yaml',
  md: 'text/markdown',
  txt: 'text/plain',
  ts: 'text/plain',
  js: 'text/javascript',
  mjs: 'text/javascript',
  py: 'text/plain',
};

/** With its full stop; empty for a format that says nothing of the bytes, or one of a later program. */
export function extensionOf(format: string): string {
  return Object.hasOwn(EXTENSIONS, format) ? EXTENSIONS[format as Format] : '';
}

export function mediaTypeOf(path: string): string {
  const extension = /\.([a-z]+)$/i.exec(path)?.[1]?.toLowerCase() ?? '';
  return Object.hasOwn(MEDIA_TYPES, extension)
    ? (MEDIA_TYPES[extension] as string)
    : 'application/octet-stream';
}
