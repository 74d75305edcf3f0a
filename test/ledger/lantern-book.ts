/** A small book as a pipeline would fill it: two runs of an invented recipe, the second with more components and newer
 *  code. Entries of the first run: 1 observation, 2 visibilities, 3 library, 4 basis, 5 fit, 6 features, 7 pictures,
 *  8 and 9 plates, 10 the run. Of the second: 11 basis, 12 fit, 13 features, 14 pictures, 15 plate, 16 the run. */

import type { Book } from '../../ledger/book.ts';
import type { PublishedNumber, RecordedCode } from '../../ledger/entry.ts';
import { CODE, entryInput, fileInput, plateDraft, published, runDraft, stageDraft } from './make-book.ts';

const NEWER: RecordedCode = {
  ...CODE,
  digest: 'beef'.repeat(16),
  version: 2,
  files: { ...CODE.files, 'stages/fit/compute.ts': 'f22e'.repeat(16) },
};

/** Fills an empty book. */
export function fillBook(book: Book): void {
  const enter = (draft: Parameters<Book['append']>[0]) => book.append(draft).entry.number;
  const [observation, visibilities, library] = enterData(book);
  const first = enterImaging(book, { visibilities, library, components: 20, code: CODE, mark: 'first' });
  const plates = [
    plateDraft(book, first.pictures, 'coverage'),
    plateDraft(book, first.pictures, 'image', 'ring-image'),
  ];
  const plateEntries = plates.map((plate) => ({ name: plate.name, plate: plate.plate, entry: enter(plate) }));
  const numbers = (value: number, features: number): PublishedNumber[] => [
    {
      ...published('ring-diameter', value, 0.8, features),
      tolerance: 0.01,
      against: { value: 42, unit: 'uas', entry: observation },
    },
    published('ring-width', value / 4, null, features),
  ];
  const stages = (imaging: Imaging) => [
    observation,
    visibilities,
    library,
    imaging.basis,
    imaging.fit,
    imaging.features,
    imaging.pictures,
  ];
  enter(runDraft(book, stages(first), { plates: plateEntries, numbers: numbers(42.1, first.features) }));
  const second = enterImaging(book, { visibilities, library, components: 30, code: NEWER, mark: 'second' });
  const plate = plateDraft(book, second.pictures, 'image', 'ring-image');
  const entry = enter(plate);
  enter(
    runDraft(book, stages(second), {
      carried: [observation, visibilities, library],
      plates: [{ name: plate.name, plate: plate.plate, entry }],
      numbers: numbers(42.9, second.features),
    }),
  );
}

function enterData(book: Book): [observation: number, visibilities: number, library: number] {
  const enter = (draft: Parameters<Book['append']>[0]) => book.append(draft).entry.number;
  const observation = enter(
    stageDraft(book, {
      name: 'observation',
      kind: 'simulate',
      key: '01'.repeat(32),
      seed: 7,
      inputs: { image: [fileInput('data/truth.fits')] },
      parameters: {
        seed: 7,
        band: { frequency: { value: 227, unit: 'GHz' }, width: { value: 2, unit: 'GHz' } },
        stations: [
          { name: 'ONE', sefd: { value: 80, unit: 'Jy' } },
          { name: 'TWO', sefd: { value: 4000, unit: 'Jy' } },
        ],
      },
      outputs: { data: ['uv-fits', 'invented visibilities\n'], truth: ['numbers', '{"values":{}}\n'] },
    }),
  );
  const visibilities = enter(
    stageDraft(book, {
      name: 'visibilities',
      kind: 'ingest',
      key: '02'.repeat(32),
      inputs: { data: [entryInput(book, observation, 'data')] },
      parameters: { averaging: 'scan', stations: ['ONE', 'TWO'] },
      outputs: { visibilities: ['visibilities', 'averaged\n'] },
      findings: [
        {
          check: 'scatter against stated noise',
          finding: 'marginal',
          value: 1.62,
          marginal: 1.5,
          limit: 2.5,
          detail: 'Scatter within 14 scans; the worst baseline is ONE-TWO.',
        },
        {
          check: 'closure',
          finding: 'within limits',
          value: 1,
          marginal: 1.5,
          limit: 2.5,
          detail: 'Triangles.',
        },
      ],
      warnings: ['3 samples of weight zero were dropped.'],
    }),
  );
  const library = enter(
    stageDraft(book, {
      name: 'library',
      kind: 'image-library',
      key: '03'.repeat(32),
      seed: 11,
      parameters: { count: 400 },
      outputs: { images: ['fits-cube', 'four hundred images\n'], manifest: ['json', '[]\n'] },
    }),
  );
  return [observation, visibilities, library];
}

interface Imaging {
  readonly basis: number;
  readonly fit: number;
  readonly features: number;
  readonly pictures: number;
}

function enterImaging(
  book: Book,
  wishes: { visibilities: number; library: number; components: number; code: RecordedCode; mark: string },
): Imaging {
  const { visibilities, library, components, code, mark } = wishes;
  const enter = (draft: Parameters<Book['append']>[0]) => book.append(draft).entry.number;
  const key = (stage: string) => `${stage}${mark === 'first' ? '1' : '2'}`.repeat(32);
  const basis = enter(
    stageDraft(book, {
      name: 'basis',
      kind: 'basis-build',
      key: key('4'),
      inputs: {
        library: [entryInput(book, library, 'images')],
        manifest: [entryInput(book, library, 'manifest')],
      },
      parameters: { components, taper: { value: 15, unit: 'uas' } },
      outputs: { basis: ['basis', `basis of ${components}\n`] },
    }),
  );
  const fit = enter(
    stageDraft(book, {
      name: 'fit',
      kind: 'fit',
      key: key('5'),
      code,
      inputs: {
        visibilities: [entryInput(book, visibilities, 'visibilities')],
        basis: [entryInput(book, basis, 'basis')],
      },
      parameters: { terms: ['amplitudes', 'closure-phases'] },
      outputs: { image: ['fits-image', `${mark} image\n`], samples: ['fits-table', `${mark} samples\n`] },
    }),
  );
  const features = enter(
    stageDraft(book, {
      name: 'features',
      kind: 'features',
      key: key('6'),
      inputs: { basis: [entryInput(book, basis, 'basis')], samples: [entryInput(book, fit, 'samples')] },
      parameters: {},
      outputs: { ring: ['numbers', `${mark} ring\n`] },
    }),
  );
  const pictures = enter(
    stageDraft(book, {
      name: 'pictures',
      kind: 'figure',
      key: key('7'),
      inputs: {
        visibilities: [entryInput(book, visibilities, 'visibilities')],
        image: [entryInput(book, fit, 'image')],
        ring: [entryInput(book, features, 'ring')],
      },
      parameters: {},
      outputs: { coverage: ['svg', '<svg>coverage</svg>\n'], image: ['svg', `<svg>${mark}</svg>\n`] },
    }),
  );
  return { basis, fit, features, pictures };
}
