/** README.txt of a bag: a page for somebody who has the bag and nothing else. */

import { type Gathered, withdrawalsIn } from './gather.ts';
import type { AbsentInput, Payload, PayloadFile } from './payload.ts';
import type { Proofs } from './proofs.ts';

export interface PageRequest {
  readonly gathered: Gathered;
  readonly payload: Payload;
  readonly programVersion: string;
  /** What the proofs in the bag rest on; null without proofs. */
  readonly seal: Proofs['seal'];
}

/** The page, lines of at most 100 characters but for names. */
export function pageText(request: PageRequest): string {
  const { gathered, payload, seal } = request;
  return [
    ...heading(request),
    ...withdrawnLines(gathered),
    ...section('What is in it', contentsLines(payload, gathered)),
    ...section('How to check it', checkLines(payload, gathered)),
    ...(seal === null
      ? section('Proofs', noProofLines())
      : section('How to check the proofs', proofLines(payload, gathered.subject, seal))),
    ...section('How to compute it again', rerunLines(payload)),
    ...section('Whose it is', persons(gathered)),
  ].join('\n');
}

function heading({ gathered, programVersion }: PageRequest): string[] {
  const title = `${gathered.title} of the book "${gathered.book}"`;
  const recipe = gathered.run === null ? '' : `, recipe ${gathered.run.recipe.name}`;
  return [
    title[0]?.toUpperCase() + title.slice(1) + recipe,
    '',
    'A bag (RFC 8493) made by Platebook ' +
      programVersion +
      '. It holds results of interferometric imaging together',
    'with the ledger entries that record how they were made: every input, parameter and output has its',
    'SHA-256 there.',
    '',
  ];
}

function section(title: string, lines: readonly string[]): string[] {
  return [title, '-'.repeat(title.length), '', ...lines, ''];
}

function withdrawnLines({ entries }: Gathered): string[] {
  const withdrawals = withdrawalsIn(entries);
  if (withdrawals.length === 0) return [];
  const lines = withdrawals.map(
    ({ withdraws, reason, by }) => `  entry ${withdraws}, by ${by.name}: ${reason.replace(/\s+/g, ' ')}`,
  );
  return section('WITHDRAWN', ['Do not rely on what depends on these:', '', ...lines]);
}

function contentsLines(payload: Payload, gathered: Gathered): string[] {
  const count = (role: PayloadFile['role']) => payload.files.filter((file) => file.role === role).length;
  const rows: [string, string][] = [
    ['data/entries/', `${count('entry')} entries of the ledger, each as it stands there: N.json is entry N`],
    ['data/proofs/', `${count('proof') - 1} proofs that entries are under a seal of the book`],
    ['data/seal.txt', 'the seal: size and root of the tree over the ledger, time, signature'],
    ['data/recipe/', `the recipe${gathered.run === null ? '' : ` of run ${gathered.run.run}`}`],
    ['data/plates/', `${count('plate')} files: published figures with their plate numbers`],
    ['data/outputs/', `${count('output')} outputs of stages, by entry and stage`],
    ['data/inputs/', `${count('input')} files that came from outside`],
    ['data/logs/', `${count('log')} logs: what the stages said`],
    ['data/code/', `${count('code')} files: the source of the stage kinds, package.json, the lock file`],
    ['data/check-proof.*', 'scripts that check a proof'],
    ['data/provenance.json', 'what was made from what, in PROV-JSON'],
    ['data/ro-crate-metadata.json', 'every file described, as an RO-Crate 1.2'],
  ];
  const described = ['data/provenance.json', 'data/ro-crate-metadata.json'];
  const lies = (place: string) =>
    payload.files.some(({ path }) => path.startsWith(place.replace(/[/*]$/, '')));
  const present = rows.filter(([place]) => described.includes(place) || lies(place));
  const width = Math.max(...present.map(([place]) => place.length));
  return [
    ...present.map(([place, what]) => `  ${place.padEnd(width)}   ${what}`),
    ...absentLines(payload.absent),
    ...payload.withoutCode.map((stage) => `  The book did not keep the code of stage ${stage}.`),
  ];
}

function absentLines(absent: readonly AbsentInput[]): string[] {
  if (absent.length === 0) return [];
  return [
    '',
    'Not in it: these files from outside. Only their digests and sizes are recorded, and no place where',
    'they can be fetched is known; whoever made the bag has them.',
    '',
    ...absent.flatMap(({ given, bytes, digest }) => [
      `  ${JSON.stringify(given)}, ${bytes} bytes`,
      `    ${digest}`,
    ]),
  ];
}

function checkLines(payload: Payload, gathered: Gathered): string[] {
  const elsewhere = payload.files.filter((file) => 'url' in file.from);
  const fetchLines =
    elsewhere.length === 0
      ? []
      : [
          '',
          `${elsewhere.length} of the files lie elsewhere: fetch.txt says where, and until they are fetched to their places`,
          'the first command reports them as missing.',
        ];
  const example = gathered.entries[0]?.entry.number ?? 1;
  return [
    'In this directory:',
    '',
    '  sha256sum -c manifest-sha256.txt',
    '  sha256sum -c tagmanifest-sha256.txt',
    '',
    'Every line must end in OK. The digest of an entry is the SHA-256 of its file, so',
    '',
    `  sha256sum data/entries/${example}.json`,
    '',
    'gives what the entry after it has under "before", and what plate numbers and seals are made from.',
    'An entry names each of its files by SHA-256: the same that manifest-sha256.txt has.',
    ...fetchLines,
  ];
}

function proofLines(
  payload: Payload,
  subject: number,
  { entries, time }: NonNullable<Proofs['seal']>,
): string[] {
  const scripts = payload.files.flatMap(({ role, path }) => (role === 'checker' ? [path] : []));
  const call = (path: string) =>
    `  ${path.endsWith('.py') ? 'python3' : 'node'} ${path} data/proofs/${subject}.json`;
  return [
    'Each file in data/proofs/ shows that an entry is under the signed seal of the book, data/seal.txt (a',
    'C2SP checkpoint; tree hashes as in RFC 9162, signature Ed25519). A seal that was printed or published',
    'elsewhere fixes everything before it. Hold the key against one that you have from the keeper of the book.',
    '',
    `The proofs rest on the seal of ${entries} entries, of ${time}: the latest when the bag was made.`,
    'A bag that is made when the book has grown rests on a later seal. It differs in the proofs, the seal, what',
    'names them, and what was said of the entries since; every other file is the same.',
    ...(scripts.length === 0
      ? []
      : ['', 'To check one with nothing but Node or Python:', '', ...scripts.map(call)]),
  ];
}

function noProofLines(): string[] {
  return ['The book had no signed seal over these entries when the bag was made.'];
}

function rerunLines(payload: Payload): string[] {
  const lines = [
    'With Platebook installed, in any directory and without the book:',
    '',
    '  platebook rerun THIS-DIRECTORY',
    '',
    'checks the bag, computes every stage again and compares each output byte for byte. It says "identical",',
    '"within tolerance" or "different". If the program installed there is not the recorded one, it says so;',
    '--trust-code then runs the code in data/code/ instead, without network and without any file but the',
    'inputs. Read that code first.',
  ];
  if (payload.absent.length === 0) return lines;
  return [
    ...lines,
    '',
    'The files that are not in the bag must lie where the recipe names them, counted from the working directory.',
  ];
}

function persons({ entries }: Gathered): string[] {
  const names = entries.map(({ entry }) =>
    entry.by.orcid === undefined ? entry.by.name : `${entry.by.name}, https://orcid.org/${entry.by.orcid}`,
  );
  return ['The entries were written by:', '', ...[...new Set(names)].map((name) => `  ${name}`)];
}
