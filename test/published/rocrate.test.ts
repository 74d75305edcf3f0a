/** The description of a bag against RO-Crate 1.2 (specification, "Root Data Entity", "Data Entities" and the appendix
 *  "RO-Crate JSON-LD"). */

import { readFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { describe, expect, it } from 'vitest';
import { sha256 } from '../../ledger/digest.ts';
import { smallDocuments } from '../data/bag/scripts/documents.ts';

interface Entity {
  readonly '@id': string;
  readonly '@type': string;
  readonly [name: string]: unknown;
}

const validated = JSON.parse(
  readFileSync(
    join(dirname(dirname(fileURLToPath(import.meta.url))), 'data', 'bag', 'validated.json'),
    'utf8',
  ),
)['ro-crate-metadata.json'];
const text = smallDocuments()['ro-crate-metadata.json'] ?? '';
const crate: { '@context': unknown; '@graph': Entity[] } = JSON.parse(text);
const graph = crate['@graph'];
const byId = new Map(graph.map((entity) => [entity['@id'], entity]));

describe('the crate of a run of the small recipe', () => {
  it('is the document that pyld expanded without losing a term', () => {
    // Validated was the document with this digest: after a change of the document, run the scripts in test/data/bag again.
    expect(sha256(text)).toBe(validated.sha256);
    expect(validated.context).toMatchObject({
      url: 'https://w3id.org/ro/crate/1.2/context',
      version: '1.2.0',
    });
    expect(validated['entities that lost a property']).toEqual([]);
    expect(validated['expanded entities']).toBe(graph.length);
    expect(validated['triples read by rdflib']).toBe(validated['n-quads']);
    for (const iris of [...Object.values(validated.keys), ...Object.values(validated.types)] as string[][]) {
      expect(iris).toEqual([expect.stringMatching(/^http:\/\/(schema\.org|purl\.org\/dc\/terms)\/\w+$/)]);
    }
  });

  it('uses no key and no type that was not among those expanded', () => {
    const keys = new Set(
      graph.flatMap((entity) => Object.keys(entity).filter((key) => !key.startsWith('@'))),
    );
    expect([...keys].sort()).toEqual(Object.keys(validated.keys).sort());
    expect([...new Set(graph.map((entity) => entity['@type']))].sort()).toEqual(
      Object.keys(validated.types).sort(),
    );
  });

  it('has a descriptor that leads to the root, which says what it must', () => {
    expect(crate['@context']).toBe('https://w3id.org/ro/crate/1.2/context');
    const descriptor = byId.get('ro-crate-metadata.json');
    expect(descriptor).toMatchObject({
      '@type': 'CreativeWork',
      about: { '@id': './' },
      conformsTo: { '@id': 'https://w3id.org/ro/crate/1.2' },
    });
    const root = byId.get('./');
    expect(root?.['@type']).toBe('Dataset');
    expect(root?.datePublished).toMatch(/^\d{4}-\d\d-\d\d$/);
    for (const key of ['name', 'description', 'license']) expect(root).toHaveProperty(key);
  });

  it('is flat: every value is a literal or a reference, and every reference within it is met', () => {
    for (const entity of graph) {
      for (const value of Object.values(entity).flat()) {
        if (typeof value !== 'object') continue;
        expect(Object.keys(value as object)).toEqual(['@id']);
        const id = (value as Entity)['@id'];
        if (!/^https?:/.test(id)) expect(byId.has(id), id).toBe(true);
      }
    }
    expect(byId.size).toBe(graph.length);
  });

  it('has every file among the parts of the root, by a relative reference without an awkward character', () => {
    const { hasPart } = byId.get('./') as Entity;
    const parts = (hasPart as Entity[]).map((part) => part['@id']);
    const files = graph.filter((entity) => entity['@type'] === 'File').map((entity) => entity['@id']);
    expect([...files].sort()).toEqual([...parts].sort());
    // RFC 3986, section 3.3: the characters of a path.
    for (const id of files) expect(id).toMatch(/^(?!\/)([A-Za-z0-9._~!$&'()*+,;=:@/-]|%[0-9A-F]{2})+$/);
    expect(validated['files that are no part']).toEqual([]);
    expect(validated['parts of the root']).toBe(files.length);
  });
});
