/** How an entry is named in one line of text. */

import type { CountersignatureEntry, Entry } from '../../ledger/entry.ts';

/** Type, name and what else tells it apart, as columns of a table. */
export function entryColumns(entry: Entry): [type: string, name: string, more: string] {
  switch (entry.type) {
    case 'stage':
      return ['stage', entry.name, entry.kind];
    case 'failure':
      return ['failure', entry.name, `${entry.kind}: ${entry.error.code}`];
    case 'run':
      return ['run', `run ${entry.run}`, `${entry.recipe.name}${entry.finished ? '' : ', not finished'}`];
    case 'plate':
      return ['plate', entry.plate, entry.name];
    case 'rerun':
      return ['rerun', `of entry ${entry.of}`, entry.verdict];
    case 'import':
      return [
        'import',
        entry.imported.name,
        `${entry.imported.type}, entry ${entry.origin.number} of ${entry.origin.book}`,
      ];
    case 'withdrawal':
      return ['withdrawal', `of entry ${entry.withdraws}`, shortened(entry.reason)];
    case 'countersignature':
      return ['countersignature', signedThing(entry).replace('the seal of', 'seal of'), entry.by.name];
    default:
      return [(entry as Entry).type, '', ''];
  }
}

/** The same in one piece: `stage fit (fit)`, `plate 8-K3Q9M2 (ring-image)`. */
export function entryTitle(entry: Entry): string {
  const [type, name, more] = entryColumns(entry);
  if (entry.type === 'run') return `run ${entry.run} (recipe ${more})`;
  return `${type} ${name} (${more})`;
}

/** What a countersignature signs: `entry 5`, `the seal of 16 entries`. */
export function signedThing({ signs, what }: CountersignatureEntry): string {
  return what.includes('\n') ? `the seal of ${signs} entries` : `entry ${signs}`;
}

/** The beginning of a long text, for one line. */
function shortened(text: string): string {
  const line = text.replace(/\s+/g, ' ');
  return line.length <= 20 ? line : `${line.slice(0, 19)}…`;
}
