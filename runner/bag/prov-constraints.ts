/** What a PROV-JSON document must hold, beyond what libraries check: formal attributes, declared prefixes, times, and the
 *  constraints of W3C PROV-CONSTRAINTS (Recommendation, 30 April 2013) that a document like ours can break. Numbers are
 *  the Recommendation's:
 *
 *      24 unique-generation            30 start-precedes-end            33 usage-within-activity
 *      34 generation-within-activity   37 generation-precedes-usage     42 derivations do not run in a circle
 *      50 typing                       55 entities and activities are disjoint
 *
 *  Invalidations, starts, ends and collections are not among our records. */

import type { Attributes, ProvDocument, ProvValue } from './prov-records.ts';

/** Formal attributes that a relation cannot be without, by the kind of what they name. */
const FORMAL: Readonly<Record<string, Readonly<Record<string, 'entity' | 'activity' | 'agent'>>>> = {
  used: { 'prov:activity': 'activity', 'prov:entity': 'entity' },
  wasGeneratedBy: { 'prov:entity': 'entity' },
  wasDerivedFrom: { 'prov:generatedEntity': 'entity', 'prov:usedEntity': 'entity' },
  wasAssociatedWith: { 'prov:activity': 'activity', 'prov:agent': 'agent' },
  wasAttributedTo: { 'prov:entity': 'entity', 'prov:agent': 'agent' },
};
/** Those that it may be without. */
const OPTIONAL: Readonly<Record<string, 'entity' | 'activity'>> = {
  'prov:activity': 'activity',
  'prov:plan': 'entity',
};
const ELEMENTS = ['entity', 'activity', 'agent'];
/** RFC 3339 with a zone; a narrower spelling than xsd:dateTime has. */
const TIME = /^\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d(\.\d+)?(Z|[+-]\d\d:\d\d)$/;

type Records = Readonly<Record<string, Attributes>>;

/** Sentences without full stop, one for each thing that does not hold. Cost: linear, but for the search for circles. */
export function provFaults(document: ProvDocument): string[] {
  const faults = [...prefixFaults(document), ...typingFaults(document), ...timeFaults(document)];
  return faults.length > 0 ? faults : [...orderFaults(document), ...derivationFaults(document)];
}

function recordsOf(document: ProvDocument, kind: string): Records {
  return (document[kind] ?? {}) as Records;
}

function kindsOf(document: ProvDocument): string[] {
  return Object.keys(document).filter((kind) => kind !== 'prefix');
}

function textOf(value: ProvValue | undefined): string | undefined {
  return typeof value === 'object' ? value.$ : value;
}

function prefixFaults(document: ProvDocument): string[] {
  const declared = new Set(['prov', 'xsd', '_', ...Object.keys(document.prefix ?? {})]);
  const faults = new Set<string>();
  const require = (name: string) => {
    const prefix = name.slice(0, Math.max(0, name.indexOf(':')));
    if (!declared.has(prefix)) faults.add(`the prefix of ${name} is not declared`);
  };
  for (const kind of kindsOf(document)) {
    for (const [id, attributes] of Object.entries(recordsOf(document, kind))) {
      require(id);
      for (const [name, value] of Object.entries(attributes)) {
        require(name);
        if (typeof value === 'object') require(value.type);
        if (typeof value === 'object' && value.type === 'prov:QUALIFIED_NAME') require(value.$);
      }
    }
  }
  return [...faults];
}

function typingFaults(document: ProvDocument): string[] {
  const faults: string[] = [];
  const isA = (type: string, name: string | undefined) =>
    name !== undefined && Object.hasOwn(recordsOf(document, type), name);
  for (const id of Object.keys(recordsOf(document, 'entity'))) {
    if (isA('activity', id)) faults.push(`${id} is an entity and an activity (constraint 55)`);
  }
  for (const kind of kindsOf(document).filter((each) => !ELEMENTS.includes(each))) {
    const formal = FORMAL[kind];
    if (formal === undefined) {
      faults.push(`${kind} is no kind of record that this program writes`);
      continue;
    }
    for (const [id, attributes] of Object.entries(recordsOf(document, kind))) {
      for (const [name, type] of Object.entries(formal)) {
        if (!isA(type, textOf(attributes[name])))
          faults.push(`${kind} ${id} has no ${type} in ${name} (constraint 50)`);
      }
      for (const [name, type] of Object.entries(OPTIONAL)) {
        if (name in formal || attributes[name] === undefined) continue;
        if (!isA(type, textOf(attributes[name])))
          faults.push(`${kind} ${id} has no ${type} in ${name} (constraint 50)`);
      }
    }
  }
  return faults;
}

function timeFaults(document: ProvDocument): string[] {
  const names = ['prov:time', 'prov:startTime', 'prov:endTime'];
  return kindsOf(document).flatMap((kind) =>
    Object.entries(recordsOf(document, kind)).flatMap(([id, attributes]) =>
      names
        .filter((name) => attributes[name] !== undefined)
        .filter((name) => {
          const text = textOf(attributes[name]) ?? '';
          return !TIME.test(text) || Number.isNaN(Date.parse(text));
        })
        .map((name) => `${kind} ${id} has no time in ${name}`),
    ),
  );
}

interface Span {
  readonly from: number;
  readonly to: number;
}

function spanOf(document: ProvDocument, activity: string | undefined): Span {
  const { 'prov:startTime': start, 'prov:endTime': end } =
    recordsOf(document, 'activity')[activity ?? ''] ?? {};
  const at = (time: ProvValue | undefined, otherwise: number) =>
    time === undefined ? otherwise : Date.parse(textOf(time) ?? '');
  return { from: at(start, Number.NEGATIVE_INFINITY), to: at(end, Number.POSITIVE_INFINITY) };
}

function orderFaults(document: ProvDocument): string[] {
  const faults: string[] = [];
  for (const id of Object.keys(recordsOf(document, 'activity'))) {
    const { from, to } = spanOf(document, id);
    if (from > to) faults.push(`${id} ends before it starts (constraint 30)`);
  }
  const generated = new Map<string, Span[]>();
  const pairs = new Set<string>();
  for (const [id, attributes] of Object.entries(recordsOf(document, 'wasGeneratedBy'))) {
    const entity = textOf(attributes['prov:entity']) ?? '';
    const activity = textOf(attributes['prov:activity']);
    const pair = `${entity} ${activity ?? id}`;
    if (pairs.has(pair)) faults.push(`${entity} is generated twice by ${activity} (constraint 24)`);
    pairs.add(pair);
    const span = eventSpan(document, attributes, activity);
    if (span === null) faults.push(`${id} lies outside ${activity} (constraint 34)`);
    else generated.set(entity, [...(generated.get(entity) ?? []), span]);
  }
  for (const [id, attributes] of Object.entries(recordsOf(document, 'used'))) {
    const entity = textOf(attributes['prov:entity']) ?? '';
    const activity = textOf(attributes['prov:activity']);
    const span = eventSpan(document, attributes, activity);
    if (span === null) faults.push(`${id} lies outside ${activity} (constraint 33)`);
    else if (generated.get(entity)?.some(({ from }) => from > span.to) === true) {
      faults.push(`${entity} is used by ${activity} before it is generated (constraint 37)`);
    }
  }
  return faults;
}

/** When a usage or generation can have been: at its own time, or while its activity went on. Null when the two differ. */
function eventSpan(
  document: ProvDocument,
  attributes: Attributes,
  activity: string | undefined,
): Span | null {
  const span = spanOf(document, activity);
  const time = textOf(attributes['prov:time']);
  if (time === undefined) return span;
  const at = Date.parse(time);
  return at >= span.from && at <= span.to ? { from: at, to: at } : null;
}

function derivationFaults(document: ProvDocument): string[] {
  const sources = new Map<string, string[]>();
  for (const attributes of Object.values(recordsOf(document, 'wasDerivedFrom'))) {
    const made = textOf(attributes['prov:generatedEntity']) ?? '';
    sources.set(made, [...(sources.get(made) ?? []), textOf(attributes['prov:usedEntity']) ?? '']);
  }
  // Takes away what depends on nothing that is left; what stays stands in a circle or depends on one.
  const left = new Map(sources);
  for (let before = -1; before !== left.size; ) {
    before = left.size;
    for (const [made, from] of left) if (!from.some((source) => left.has(source))) left.delete(made);
  }
  return [...left.keys()].map((entity) => `${entity} is derived from itself (constraint 42)`);
}
