/** The description of a bag's payload as a research object crate, RO-Crate 1.2: `ro-crate-metadata.json`, a flat graph in
 *  JSON-LD in which the root, `./`, has every file as a part, every stage is an action with its objects and results, and
 *  every word is one of the published context. The root of the crate is the bag's `data` folder. */

import type { Person, RunEntry, StageEntry } from '../../ledger/entry.ts';
import type { Gathered } from './gather.ts';
import { uriOfPath } from './paths.ts';
import type { PayloadFile } from './payload.ts';

const CONTEXT = 'https://w3id.org/ro/crate/1.2/context';
const VERSION = 'https://w3id.org/ro/crate/1.2';
const DESCRIPTOR = 'ro-crate-metadata.json';

interface Reference {
  readonly '@id': string;
}
type Property = string | number | Reference | readonly Reference[] | readonly string[];
export type CrateEntity = { readonly '@id': string; readonly '@type': string } & {
  readonly [name: string]: Property;
};

export interface Crate {
  readonly '@context': string;
  readonly '@graph': readonly CrateEntity[];
}

export interface CrateRequest {
  readonly gathered: Gathered;
  /** All payload files but the description itself. */
  readonly files: readonly PayloadFile[];
  readonly programVersion: string;
  /** RFC 3339 date. */
  readonly date: string;
}

/** The description. Persons, programs and numbers follow the files, each once. */
export function crateOf(request: CrateRequest): Crate {
  const { gathered, files } = request;
  const entities = new Map<string, CrateEntity>();
  const add = (entity: CrateEntity): Reference => {
    if (!entities.has(entity['@id'])) entities.set(entity['@id'], entity);
    return reference(entity['@id']);
  };
  const parts = files.map((file) => add(fileEntity(file)));
  const program = add({
    '@id': '#platebook',
    '@type': 'SoftwareApplication',
    name: 'Platebook',
    softwareVersion: request.programVersion,
  });
  const actions: Reference[] = [];
  for (const { entry } of gathered.entries) {
    if (entry.type === 'stage') actions.push(add(actionOf(entry, files, program, add)));
  }
  const numbers = gathered.run === null ? [] : numbersOf(gathered.run, files).map(add);
  const root = rootEntity(request, { parts, actions, numbers, add });
  return { '@context': CONTEXT, '@graph': [descriptorEntity(), root, ...entities.values()] };
}

function descriptorEntity(): CrateEntity {
  return {
    '@id': DESCRIPTOR,
    '@type': 'CreativeWork',
    about: reference('./'),
    conformsTo: reference(VERSION),
  };
}

interface Contents {
  readonly parts: readonly Reference[];
  readonly actions: readonly Reference[];
  readonly numbers: readonly Reference[];
  readonly add: (entity: CrateEntity) => Reference;
}

function rootEntity(
  { gathered, files, date }: CrateRequest,
  { parts, actions, numbers, add }: Contents,
): CrateEntity {
  const { book, title, entries, run } = gathered;
  const recipe = files.find(({ role }) => role === 'recipe');
  const persons = entries.map(({ entry }) => add(personEntity(entry.by)));
  const creators = [...new Map(persons.map((person) => [person['@id'], person])).values()];
  return {
    '@id': './',
    '@type': 'Dataset',
    name:
      run === null
        ? `${title} of the book ${book}`
        : `${title} of the book ${book}, recipe ${run.recipe.name}`,
    description:
      'Entries of a Platebook ledger with everything that they depend on: recipe, inputs, outputs, code and digests.',
    datePublished: date,
    license: add(noLicence()),
    creator: creators,
    hasPart: parts,
    ...(recipe === undefined ? {} : { mainEntity: reference(idOf(recipe)) }),
    ...(actions.length === 0 ? {} : { mentions: actions }),
    ...(numbers.length === 0 ? {} : { variableMeasured: numbers }),
  };
}

/** A crate must name a licence, and a book knows none. */
function noLicence(): CrateEntity {
  return {
    '@id': '#no-licence-stated',
    '@type': 'CreativeWork',
    name: 'No licence stated',
    description:
      'The book records no licence. Ask the creators before you use these files beyond checking them.',
  };
}

function personEntity({ name, orcid }: Person): CrateEntity {
  const id = orcid === undefined ? `#person-${encodeURIComponent(name)}` : `https://orcid.org/${orcid}`;
  return { '@id': id, '@type': 'Person', name };
}

function fileEntity(file: PayloadFile): CrateEntity {
  return {
    '@id': idOf(file),
    '@type': 'File',
    name: file.about,
    encodingFormat: file.mediaType,
    contentSize: String(file.bytes),
    sha256: file.digest,
  };
}

/** Relative to the crate's root, the folder `data`. */
function idOf({ path }: PayloadFile): string {
  return uriOfPath(path.replace(/^data\//, ''));
}

function actionOf(
  stage: StageEntry,
  files: readonly PayloadFile[],
  program: Reference,
  add: (entity: CrateEntity) => Reference,
): CrateEntity {
  const byDigest = (digest: string) => files.find((file) => file.digest === digest && file.role !== 'code');
  const objects = Object.values(stage.inputs)
    .flat()
    .flatMap((input) => {
      const file =
        'entry' in input.origin
          ? outputOf(files, input.origin.entry, input.origin.output)
          : byDigest(input.digest);
      return file === undefined ? [] : [idOf(file)];
    });
  const results = Object.keys(stage.outputs).flatMap((name) => {
    const file = outputOf(files, stage.number, name);
    return file === undefined ? [] : [idOf(file)];
  });
  return {
    '@id': `#entry-${stage.number}`,
    '@type': 'CreateAction',
    name: `Stage ${stage.name} (kind ${stage.kind}), entry ${stage.number}`,
    endTime: stage.time,
    agent: add(personEntity(stage.by)),
    instrument: program,
    object: [...new Set(objects)].map(reference),
    result: results.map(reference),
  };
}

function outputOf(files: readonly PayloadFile[], entry: number, name: string): PayloadFile | undefined {
  return files.find((file) => file.role === 'output' && file.entry === entry && file.name === name);
}

function numbersOf({ numbers }: RunEntry, files: readonly PayloadFile[]): CrateEntity[] {
  return numbers.map((number) => {
    const file = outputOf(files, number.entry, number.output);
    return {
      '@id': `#number-${encodeURIComponent(number.name)}`,
      '@type': 'PropertyValue',
      name: number.name,
      value: number.value,
      unitText: number.unit,
      ...(number.low === null ? {} : { minValue: number.low }),
      ...(number.high === null ? {} : { maxValue: number.high }),
      ...(file === undefined ? {} : { subjectOf: reference(idOf(file)) }),
    };
  });
}

function reference(id: string): Reference {
  return { '@id': id };
}
