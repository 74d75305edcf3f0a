/** The small files at the top of a bag: bagit.txt, bag-info.txt, fetch.txt (RFC 8493, sections 2.1.1, 2.2.2, 2.2.3). */

import { requirePath } from './manifest.ts';
import { encodePath } from './paths.ts';
import { badBag } from './problem.ts';

/** Exactly these two lines. */
export const BAG_DECLARATION = 'BagIt-Version: 1.0\nTag-File-Character-Encoding: UTF-8\n';

/** The text of bag-info.txt. Values hold no line feed. */
export function formatBagInfo(fields: readonly (readonly [label: string, value: string])[]): string {
  return fields.map(([label, value]) => `${label}: ${value.replace(/\s+/g, ' ').trim()}\n`).join('');
}

/** The fields of bag-info.txt, in order; a line that begins with white space continues the one before.
 *  @throws RunnerProblem 'bad-bag' */
export function parseBagInfo(text: string): [label: string, value: string][] {
  const fields: [string, string][] = [];
  for (const [i, line] of text.replace(/\n$/, '').split('\n').entries()) {
    const last = fields.at(-1);
    const field = /^([^:\s][^:]*):[ \t]*(.*)$/.exec(line);
    if (/^[ \t]/.test(line) && last !== undefined) last[1] = `${last[1]} ${line.trim()}`;
    else if (field === null)
      throw badBag(
        `bag-info.txt:${i + 1}`,
        'a label, a colon and a value',
        JSON.stringify(line.slice(0, 80)),
      );
    else fields.push([field[1] ?? '', field[2] ?? '']);
  }
  return fields;
}

/** Octets and files of a payload, as `Payload-Oxum` has them. */
export interface PayloadSize {
  readonly bytes: number;
  readonly files: number;
}

export function formatOxum({ bytes, files }: PayloadSize): string {
  return `${bytes}.${files}`;
}

/** @throws RunnerProblem 'bad-bag' */
export function parseOxum(text: string): PayloadSize {
  const parts = /^(\d{1,15})\.(\d{1,9})$/.exec(text);
  if (parts === null)
    throw badBag('bag-info.txt', 'a Payload-Oxum such as 996.3', JSON.stringify(text.slice(0, 80)));
  return { bytes: Number(parts[1]), files: Number(parts[2]) };
}

/** A file of the payload that lies elsewhere. */
export interface FetchItem {
  readonly url: string;
  /** Null where it is not known, written `-`. */
  readonly bytes: number | null;
  readonly path: string;
}

/** The text of fetch.txt, in the order of the paths. */
export function formatFetch(items: readonly FetchItem[]): string {
  const sorted = items.toSorted((a, b) => (a.path < b.path ? -1 : 1));
  return sorted.map(({ url, bytes, path }) => `${url} ${bytes ?? '-'} ${encodePath(path)}\n`).join('');
}

/** @throws RunnerProblem 'bad-bag' */
export function parseFetch(text: string): FetchItem[] {
  const lines = text.split('\n');
  if (lines.pop() !== '') throw badBag('fetch.txt', 'a line feed at the end of the last line', 'none');
  return lines.map((line, i) => {
    const place = `fetch.txt:${i + 1}`;
    const parts = /^(\S+)[ \t]+(\d{1,15}|-)[ \t]+(.+)$/.exec(line);
    if (parts === null) throw badBag(place, 'a URL, a length and a path', JSON.stringify(line.slice(0, 80)));
    const [, url = '', bytes, path = ''] = parts;
    return { url, bytes: bytes === '-' ? null : Number(bytes), path: requirePath(path, place) };
  });
}
