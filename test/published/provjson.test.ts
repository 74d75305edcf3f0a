/** Provenance documents against PROV-JSON (W3C Member Submission, 24 April 2013) and PROV-CONSTRAINTS (W3C Recommendation,
 *  30 April 2013). */

import { readFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { describe, expect, it } from 'vitest';
import { sha256 } from '../../ledger/digest.ts';
import { provFaults } from '../../runner/bag/prov-constraints.ts';
import type { ProvDocument } from '../../runner/bag/prov-records.ts';
import { provenanceOf } from '../../runner/bag/provenance.ts';
import { smallDocuments, smallRun } from '../data/bag/scripts/documents.ts';

const validated = JSON.parse(
  readFileSync(
    join(dirname(dirname(fileURLToPath(import.meta.url))), 'data', 'bag', 'validated.json'),
    'utf8',
  ),
)['provenance.json'];

/** After the examples of the Submission, sections 2 and 3; python3-prov 2.0.0 reads it, writes it and finds the two
 *  equal. */
const minimal = (): Record<string, Record<string, Record<string, unknown>>> => ({
  prefix: { ex: 'https://example.org/ledger#' } as never,
  entity: {
    'ex:in1': { 'prov:type': { $: 'prov:Collection', type: 'prov:QUALIFIED_NAME' } },
    'ex:out1': { 'prov:label': 'basis', 'ex:bytes': { $: '1234', type: 'xsd:long' } },
  },
  activity: {
    'ex:run1': { 'prov:startTime': '2024-01-01T00:00:00Z', 'prov:endTime': '2024-01-01T00:00:05.250Z' },
  },
  agent: { 'ex:key1': { 'prov:type': { $: 'prov:SoftwareAgent', type: 'prov:QUALIFIED_NAME' } } },
  used: {
    '_:u1': { 'prov:activity': 'ex:run1', 'prov:entity': 'ex:in1', 'prov:time': '2024-01-01T00:00:00Z' },
  },
  wasGeneratedBy: {
    '_:g1': { 'prov:entity': 'ex:out1', 'prov:activity': 'ex:run1', 'prov:time': '2024-01-01T00:00:05Z' },
  },
  wasDerivedFrom: {
    '_:d1': { 'prov:generatedEntity': 'ex:out1', 'prov:usedEntity': 'ex:in1', 'prov:activity': 'ex:run1' },
  },
  wasAssociatedWith: { '_:a1': { 'prov:activity': 'ex:run1', 'prov:agent': 'ex:key1' } },
  wasAttributedTo: { '_:t1': { 'prov:entity': 'ex:out1', 'prov:agent': 'ex:key1' } },
});

const faultsAfter = (change: (document: ReturnType<typeof minimal>) => void) => {
  const document = minimal();
  change(document);
  return provFaults(document as unknown as ProvDocument);
};

describe('the constraints', () => {
  it('hold for the minimal document', () => {
    expect(faultsAfter(() => {})).toEqual([]);
  });

  it('find what the library accepts: a usage of nothing, an end before the start, a time that is none', () => {
    expect(faultsAfter(({ used }) => delete used?.['_:u1']?.['prov:activity'])).toEqual([
      'used _:u1 has no activity in prov:activity (constraint 50)',
    ]);
    expect(
      faultsAfter(({ activity }) =>
        Object.assign(activity?.['ex:run1'] ?? {}, { 'prov:endTime': '2023-01-01T00:00:00Z' }),
      ),
    ).toContain('ex:run1 ends before it starts (constraint 30)');
    expect(
      faultsAfter(({ used }) => Object.assign(used?.['_:u1'] ?? {}, { 'prov:time': 'yesterday' })),
    ).toEqual(['used _:u1 has no time in prov:time']);
  });

  it('find what else can be wrong', () => {
    expect(faultsAfter(({ entity }) => Object.assign(entity ?? {}, { 'zz:x': {} }))).toEqual([
      'the prefix of zz:x is not declared',
    ]);
    expect(faultsAfter((document) => Object.assign(document, { wasEatenBy: {} }))).toEqual([
      'wasEatenBy is no kind of record that this program writes',
    ]);
    expect(faultsAfter(({ entity }) => Object.assign(entity ?? {}, { 'ex:run1': {} }))).toEqual([
      'ex:run1 is an entity and an activity (constraint 55)',
    ]);
    expect(
      faultsAfter(({ wasGeneratedBy }) =>
        Object.assign(wasGeneratedBy ?? {}, { '_:g2': { ...wasGeneratedBy?.['_:g1'] } }),
      ),
    ).toEqual(['ex:out1 is generated twice by ex:run1 (constraint 24)']);
    expect(
      faultsAfter(({ used }) => Object.assign(used?.['_:u1'] ?? {}, { 'prov:time': '2024-01-02T00:00:00Z' })),
    ).toEqual(['_:u1 lies outside ex:run1 (constraint 33)']);
    expect(
      faultsAfter(({ wasGeneratedBy }) =>
        Object.assign(wasGeneratedBy?.['_:g1'] ?? {}, { 'prov:time': '2023-01-02T00:00:00Z' }),
      ),
    ).toEqual(['_:g1 lies outside ex:run1 (constraint 34)']);
    expect(
      faultsAfter(({ activity, used }) => {
        Object.assign(activity ?? {}, { 'ex:early': { 'prov:endTime': '2020-01-01T00:00:00Z' } });
        Object.assign(used ?? {}, { '_:u2': { 'prov:activity': 'ex:early', 'prov:entity': 'ex:out1' } });
      }),
    ).toEqual(['ex:out1 is used by ex:early before it is generated (constraint 37)']);
    expect(
      faultsAfter(({ wasDerivedFrom }) =>
        Object.assign(wasDerivedFrom ?? {}, {
          '_:d2': { 'prov:generatedEntity': 'ex:in1', 'prov:usedEntity': 'ex:out1' },
        }),
      ),
    ).toEqual([
      'ex:out1 is derived from itself (constraint 42)',
      'ex:in1 is derived from itself (constraint 42)',
    ]);
  });
});

describe('the provenance of a run of the small recipe', () => {
  it('is the document that python3-prov read, wrote and found equal', () => {
    // Validated was the document with this digest: after a change of the document, run the scripts in test/data/bag again.
    expect(sha256(smallDocuments()['provenance.json'] ?? '')).toBe(validated.sha256);
    expect(validated).toMatchObject({ library: 'prov 2.0.0', 'round trip': 'equal' });
    expect(validated['unified records']).toBe(validated.records);
  });

  it('holds as many records of each kind as the entries name', () => {
    const { entries } = smallRun();
    const stages = entries.flatMap(({ entry }) => (entry.type === 'stage' ? [entry] : []));
    const plates = entries.filter(({ entry }) => entry.type === 'plate').length;
    const inputs = stages.map((stage) => Object.values(stage.inputs).flat().length);
    const outputs = stages.map((stage) => Object.keys(stage.outputs).length);
    const numbers = entries.flatMap(({ entry }) => (entry.type === 'run' ? entry.numbers : [])).length;
    const sum = (list: readonly number[]) => list.reduce((a, b) => a + b, 0);
    expect(validated.kinds).toEqual({
      ProvActivity: stages.length + plates,
      ProvAgent: 1,
      ProvAssociation: stages.length + plates,
      ProvAttribution: entries.length + numbers,
      // Each output from each input, each plate's two files from its figure, each number from its output.
      ProvDerivation: sum(inputs.map((count, i) => count * (outputs[i] ?? 0))) + 2 * plates + numbers,
      // Lines, outputs, the two files of each plate, numbers, the recipe.
      ProvEntity: entries.length + sum(outputs) + 2 * plates + numbers + 1,
      ProvGeneration: entries.length + sum(outputs) + 2 * plates,
      ProvUsage: sum(inputs) + plates,
    });
  });

  it('has no times when the clock was set back between two entries, and holds to the constraints all the same', () => {
    const run = smallRun();
    expect(provFaults(provenanceOf(run))).toEqual([]);
    const entries = run.entries.map((bagged) =>
      bagged.entry.number < 8
        ? bagged
        : { ...bagged, entry: { ...bagged.entry, time: '2020-01-01T00:00:00.000Z' } },
    );
    const document = provenanceOf({ ...run, entries });
    expect(provFaults(document)).toEqual([]);
    expect(JSON.stringify(document.activity)).not.toContain('prov:startTime');
    expect(JSON.stringify(provenanceOf(run).activity)).toContain('prov:startTime');
  });
});
