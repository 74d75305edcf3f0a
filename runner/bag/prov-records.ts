/** Records of a PROV-JSON document (W3C Member Submission, 24 April 2013): kinds of record, identifier, attributes. */

import type { Person } from '../../ledger/entry.ts';

export type ProvValue = string | { readonly $: string; readonly type: string };
export interface Attributes {
  readonly [name: string]: ProvValue | undefined;
}
/** `prefix`, and for each kind of record its records by identifier. */
export type ProvDocument = Readonly<Record<string, Readonly<Record<string, string | Attributes>>>>;

/** No host can have this name (RFC 2606, section 2): words of our own. */
const OURS = 'https://platebook.invalid';

const PREFIXES = {
  sha256: 'nih:sha-256;',
  person: `${OURS}/person/`,
  orcid: 'https://orcid.org/',
  platebook: `${OURS}/terms#`,
};

export interface ProvRecords {
  /** An entity, activity or agent; the last word of one identifier counts. */
  put(kind: 'entity' | 'activity' | 'agent', id: string, attributes: Attributes): void;
  /** A relation; relations have numbers. */
  relate(kind: string, attributes: Attributes): void;
  /** The identifier of a person, who is put among the agents. */
  agent(person: Person): string;
  document(): ProvDocument;
}

/** Nothing yet. */
export function provRecords(): ProvRecords {
  const records: Record<string, Record<string, Attributes>> = {};
  let relations = 0;
  const write = (kind: string, id: string, attributes: Attributes) => {
    records[kind] ??= {};
    (records[kind] as Record<string, Attributes>)[id] = attributes;
  };
  return {
    put: write,
    relate(kind, attributes) {
      relations += 1;
      write(kind, `_:r${relations}`, attributes);
    },
    agent(person) {
      const id = person.orcid === undefined ? `person:${localName(person.name)}` : `orcid:${person.orcid}`;
      write('agent', id, { 'prov:type': qualified('prov:Person'), 'prov:label': person.name });
      return id;
    },
    document: () => ({ prefix: PREFIXES, ...records }),
  };
}

/** A qualified name as a value. */
export function qualified(name: string): ProvValue {
  return { $: name, type: 'prov:QUALIFIED_NAME' };
}

/** A name as (the end of) the local part of a qualified name. */
export function localName(name: string): string {
  const escaped = (c: string) => `%${c.charCodeAt(0).toString(16).toUpperCase()}`;
  return encodeURIComponent(name.toWellFormed()).replace(/[!'()*]/g, escaped);
}
