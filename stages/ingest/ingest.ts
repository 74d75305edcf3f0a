/** Declaration of the kind `ingest`: from observed data as they come to visibilities averaged by scan. */

import type { StageKind } from '../kind.ts';

export const ingest = {
  kind: 'ingest',
  version: 5,
  doc:
    'Reads FITS random groups (uv data), OIFITS 1 and 2 or a table (CSV); what it is, the content says. Selects band, ' +
    'polarisation, stations and times; drops what is flagged, not finite or of no finite positive weight and counts ' +
    'every dropped sample by its reason; checks (u,v) against the station positions; finds scans; averages ' +
    'coherently with weights; compares the scatter inside a scan with the stated noise.',
  source:
    'Common practice. (u,v) from station positions: Thompson, Moran & Swenson, Interferometry and Synthesis in Radio ' +
    'Astronomy, 3rd ed., eq. 4.1; random groups: FITS Standard 4.0, section 6; OIFITS 2: Duvert, Young & Hummel 2017, ' +
    'A&A 597, A8; precession: Lieske 1979, A&A 73, 282.',
  inputs: {
    data: { format: ['uv-fits', 'oifits', 'csv'], doc: 'The observed visibilities.' },
  },
  parameters: {
    polarisation: {
      type: 'word',
      words: ['stokes-i', 'I', 'RR', 'LL', 'XX', 'YY'],
      default: 'stokes-i',
      doc: 'Stokes I from the parallel hands (or from I, where the file holds it), or one hand alone.',
      why: 'The total intensity is what an image shows, and both hands together have the lower noise.',
    },
    bands: {
      type: 'list',
      of: { type: 'integer', from: 1, doc: 'Number of a band (the IF axis), from 1.' },
      least: 1,
      optional: true,
      doc: 'Bands to use; averaged together. All when left out.',
    },
    channels: {
      type: 'list',
      of: {
        type: 'integer',
        from: 1,
        doc: 'Number of a channel within its band, or of a wavelength, from 1.',
      },
      least: 1,
      optional: true,
      doc: 'Channels to use; averaged together. All when left out.',
    },
    target: {
      type: 'text',
      optional: true,
      doc: 'Which target to read, where an OIFITS file holds several.',
    },
    leaveOut: {
      type: 'list',
      of: { type: 'text', doc: 'Name of a station, or the number of one that the antenna table lacks.' },
      default: [],
      doc: 'Stations to leave out.',
      why: 'Nothing is left out unless the recipe says so.',
    },
    fromHours: {
      type: 'quantity',
      unit: 'h',
      optional: true,
      doc: 'Earliest time to use, since 0 h UTC of the day of the first row; inclusive.',
    },
    toHours: {
      type: 'quantity',
      unit: 'h',
      optional: true,
      doc: 'Latest time to use, since 0 h UTC of the day of the first row; inclusive.',
    },
    fromMjd: { type: 'number', optional: true, doc: 'Earliest time to use as MJD (UTC); inclusive.' },
    toMjd: { type: 'number', optional: true, doc: 'Latest time to use as MJD (UTC); inclusive.' },
    gap: {
      type: 'quantity',
      unit: 's',
      from: 0,
      default: '60 s',
      doc: 'Time without data, from the end of one record to the start of the next, that ends a scan.',
      why: 'Gaps between scans are minutes and records seconds: anything from 30 s to 120 s gives the same scans.',
    },
    averaging: {
      type: 'either',
      of: [
        { type: 'word', words: ['scan', 'none'], doc: 'Over whole scans, or not at all.' },
        { type: 'quantity', unit: 's', from: 0.001, doc: 'Intervals of that length within scans.' },
      ],
      default: 'scan',
      doc: 'Over what is averaged coherently; each interval counts as one scan in the output.',
      why: 'Phases of calibrated data hold over a scan; the report says how much amplitude the average loses.',
    },
    completeness: {
      type: 'number',
      from: 0,
      to: 1,
      default: 0.5,
      doc: "A baseline is dropped from a scan when it is in less than this fraction of the scan's records.",
      why: 'A mean over other times than its neighbours shifts closure phases by degrees.',
    },
    leastSnr: {
      type: 'number',
      from: 0,
      optional: true,
      doc: 'Averaged visibilities below this signal-to-noise ratio are dropped. None when left out.',
      why: 'A cut selects upward noise, so there is none unless the recipe says so.',
    },
    uvSign: {
      type: 'word',
      words: ['check', 'as-written', 'reversed'],
      default: 'check',
      doc:
        'How the file counts u and v. `check`: as its format says, which must agree with the station positions or the ' +
        'stage stops; `as-written`: as its format says, whatever the positions say; `reversed`: the other way round.',
      why: 'A wrong sign turns the picture by 180°, and the data alone never betray it.',
    },
    rules: {
      type: 'word',
      words: ['enforce', 'ignore'],
      default: 'enforce',
      doc:
        'Only for OIFITS: whether a file that breaks a rule of the standard without which it can still be read is refused: a ' +
        'mandatory keyword or column that is missing, a negative error, wavelengths out of order, a wrong revision.',
      why: 'A file that breaks one rule may break others that nobody sees.',
    },
    checksums: {
      type: 'word',
      words: ['verify', 'ignore'],
      default: 'verify',
      doc: 'Whether CHECKSUM and DATASUM of uv data, where the file has them, must be right. Those of OIFITS always must.',
      why: 'A wrong sum means changed bytes.',
    },
    columns: {
      type: 'map',
      of: {
        type: 'either',
        of: [
          { type: 'text', doc: "The column's name; its values are in the unit given below." },
          {
            type: 'group',
            doc: "The column's name and the unit of its values.",
            fields: {
              column: { type: 'text', doc: 'Name in the first line of the table.' },
              unit: { type: 'text', optional: true, doc: 'Unit of the values.' },
            },
          },
        ],
        doc: 'Where a thing stands in the table.',
      },
      optional: true,
      doc:
        'Only for tables: which column holds what. Required: station1, station2, time (MJD, JD, or a unit of time since ' +
        '`timeOrigin`), u and v (lambda, klambda, Mlambda, Glambda, or a unit of length or time), re and im, or ' +
        'amplitude and phase (Jy; deg), sigma (Jy) or weight (1/Jy²). Optional: integration (s), flag (true or 1 drops). ' +
        'Without a unit: MJD, lambda, Jy, deg, s. u and v run from station 1 to station 2 with V = Σ I exp(−2πi(ux + vy)).',
    },
    timeOrigin: {
      type: 'number',
      default: 0,
      doc: 'Only for tables: MJD from which a time in s, min, h or d counts.',
      why: 'With 0 a time in days is a MJD.',
    },
    table: {
      type: 'group',
      optional: true,
      doc: 'Only for tables, which do not say it themselves: what was observed, how.',
      fields: {
        target: { type: 'text', doc: "The target's name." },
        ra: { type: 'quantity', unit: 'deg', from: 0, to: 360, doc: 'Right ascension.' },
        dec: { type: 'quantity', unit: 'deg', from: -90, to: 90, doc: 'Declination.' },
        frequency: { type: 'quantity', unit: 'Hz', from: 1, doc: 'Frequency of the middle of the band.' },
        bandwidth: {
          type: 'quantity',
          unit: 'Hz',
          from: 0,
          default: '0 Hz',
          doc: 'Width of the band.',
          why: 'Not needed to compute.',
        },
        array: { type: 'text', default: 'unnamed', doc: "The array's name.", why: 'Not needed to compute.' },
        remark: { type: 'text', default: '', doc: 'A remark to carry on to reports.', why: 'None.' },
        stations: {
          type: 'map',
          of: {
            type: 'list',
            of: { type: 'quantity', unit: 'm', doc: 'A coordinate.' },
            least: 3,
            most: 3,
            doc: 'X, Y, Z.',
          },
          default: {},
          doc: 'Geocentric positions (ITRF) of stations; (0, 0, 0) stands for unknown.',
          why: 'Only some checks need positions.',
        },
      },
    },
  },
  outputs: {
    visibilities: { format: 'visibilities', doc: 'One row per baseline and scan.' },
    report: {
      format: 'json',
      doc:
        'Rows and samples read, samples dropped by reason, stations, scans, agreement of (u,v), scatter inside scans over ' +
        'the stated noise, coherence, warnings.',
    },
  },
  load: () => import('./compute.ts'),
} as const satisfies StageKind;
