/** Declaration of the kind `image-library`: the images from which a basis is built. */

import type { ParameterDeclaration, StageKind } from '../kind.ts';
import { FAMILIES, type Family, type SizeRange } from './families.ts';

export const imageLibrary = {
  kind: 'image-library',
  version: 2,
  doc:
    'A library of images of unit flux with their centroid at the origin, all on one grid: random images of declared ' +
    "families, rings and what is no ring, and the group's own simulations. Generated images are drawn in the " +
    'Fourier plane from closed forms and softened by a Gaussian of two pixels. Own images are brought to the grid by ' +
    'spreading each of their pixels over the nearest ones, which keeps flux and centroid, and may be added several ' +
    'times, turned and scaled. The manifest lists every image with its family and what was drawn for it.',
  source:
    'Closed forms: Thompson, Moran & Swenson, Interferometry and Synthesis in Radio Astronomy, 3rd ed., ch. 10; ' +
    'Bracewell, The Fourier Transform and Its Applications, ch. 12 and 13. Spreading over the nearest pixels: ' +
    'Hockney & Eastwood, Computer Simulation Using Particles, ch. 5 (cloud in cell).',
  inputs: {
    images: {
      format: ['fits-image', 'fits-cube'],
      many: true,
      optional: true,
      doc: "The group's own images, each of one source, of any size and pixel; the flux must be positive.",
    },
  },
  parameters: {
    pixels: {
      type: 'integer',
      from: 16,
      to: 512,
      default: 64,
      doc: 'Pixels along each side.',
      why: 'With the default field a pixel is 2.5 uas, a tenth of the beam of an array as large as the Earth at 1.3 mm.',
    },
    field: {
      type: 'quantity',
      unit: 'uas',
      from: 1,
      to: 1e6,
      default: '160 uas',
      doc: 'Side of the field.',
      why: 'Twice the largest default image, so that nothing meets itself across the edge.',
    },
    seed: { type: 'integer', default: 1, doc: 'Seed of all random numbers.' },
    families: {
      type: 'group',
      doc: 'Families of generated images: how many, and the ranges that sizes are drawn from. A count of 0 leaves one out.',
      why: 'Much is no ring and some is impossible in theory, so that a ring in the result comes from the data.',
      fields: Object.fromEntries(
        Object.entries(FAMILIES).map(([name, family]) => [name, familyGroup(family)]),
      ),
    },
    copies: {
      type: 'integer',
      from: 1,
      to: 1000,
      default: 10,
      doc: 'How often each own image enters: once as it is, the others turned and scaled at random.',
      why: 'The position angle of a source is not known beforehand; ten angles are 36 degrees apart.',
    },
    copyScale: {
      type: 'list',
      of: { type: 'number', from: 0.01, to: 100, doc: 'A factor.' },
      least: 2,
      most: 2,
      default: [0.8, 1.25],
      doc: 'Range of the factor by which copies are larger than the image itself.',
      why: 'The mass that sets the size of a simulation is known no better.',
    },
  },
  outputs: {
    images: { format: 'fits-cube', doc: 'The images, family after family, then the own ones.' },
    manifest: {
      format: 'json',
      doc:
        'The grid, the count of each family, and for every image its family and what was drawn for it: lengths in uas, ' +
        'angles in degrees from north through east, before centring and softening.',
    },
  },
  load: () => import('./compute.ts'),
} as const satisfies StageKind;

function familyGroup({ count, doc, ranges }: Family): ParameterDeclaration {
  const fields: Record<string, ParameterDeclaration> = {
    count: { type: 'integer', from: 0, to: 1_000_000, default: count, doc: 'How many images.' },
  };
  for (const [name, range] of Object.entries(ranges)) fields[name] = rangeList(range);
  return { type: 'group', doc, fields };
}

function rangeList({ unit, low, high, from, to, doc }: SizeRange): ParameterDeclaration {
  const shared = { type: 'list', least: 2, most: 2, doc } as const;
  if (unit === '') {
    return { ...shared, of: { type: 'number', from, to, doc: 'A limit.' }, default: [low, high] };
  }
  return {
    ...shared,
    of: { type: 'quantity', unit, from, to, doc: 'A limit.' },
    default: [`${low} ${unit}`, `${high} ${unit}`],
  };
}
