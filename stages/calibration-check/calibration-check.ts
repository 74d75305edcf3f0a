/** Declaration of the kind `calibration-check`: tests of what must agree whatever the source, and an error budget. */

import type { ParameterDeclaration, StageKind } from '../kind.ts';

const scatterLimits = (doc: string): ParameterDeclaration => limits(doc, 1.5, 2.5, SCATTER_WHY);
const SCATTER_WHY =
  'Sound data have 1; public millimetre data of good name had 1.43 on triangles that must close (common practice).';

/** Limits of one check. */
function limits(doc: string, marginal: number, limit: number, why: string): ParameterDeclaration {
  return {
    type: 'group',
    default: {},
    doc,
    fields: {
      marginal: {
        type: 'number',
        from: 0,
        default: marginal,
        doc: 'Above this the finding is marginal.',
        why,
      },
      limit: { type: 'number', from: 0, default: limit, doc: 'Above this it is out of limits.', why },
    },
  };
}

export const calibrationCheck = {
  kind: 'calibration-check',
  version: 4,
  doc:
    'Checks the calibration on what must agree whatever the source looks like: triangles with two co-located stations ' +
    'close to zero and follow neither Sun, elevation nor time, co-located stations see the same far baselines, closures ' +
    'agree between bands, hands or days, gains keep their level. Estimates the error budget that brings these to unit ' +
    'scatter, with its interval, and adds it in quadrature. The report says how often noise alone would exceed each ' +
    'limit. A check out of limits stops the run unless the recipe says otherwise.',
  source:
    'Closures: Thompson, Moran & Swenson, Interferometry and Synthesis in Radio Astronomy, 3rd ed., section 10.3. Errors ' +
    'of single baselines: Baarda 1968, Publ. Geod. 2(5). Trends: Kendall 1938, Biometrika 30, 81. The Sun: Meeus, ' +
    'Astronomical Algorithms, 2nd ed., chapter 25. Checks on co-located stations and the error budget in quadrature: ' +
    'common practice.',
  inputs: {
    visibilities: { format: 'visibilities', doc: 'Visibilities averaged by scan.' },
    report: {
      format: 'json',
      optional: true,
      doc: 'The report of `ingest`: with it the scatter inside scans is checked against the stated noise.',
    },
    fitReport: {
      format: 'json',
      optional: true,
      doc: 'The report of a fit to these visibilities: with it the gain of every station is checked against time.',
    },
    residuals: {
      format: 'json',
      optional: true,
      doc: 'The residuals of that fit: with them baselines are found whose phases or amplitudes do not close.',
    },
    other: {
      format: 'visibilities',
      optional: true,
      many: true,
      doc:
        'The same observation in another band or hand, or the same tracks on another day, one or several, from stages of ' +
        'kind `ingest` of their own with errors of their own: with each, closures are checked against each other, of ' +
        'days at like sidereal time. They are only compared, never joined to the visibilities.',
    },
  },
  parameters: {
    colocated: {
      type: 'quantity',
      unit: 'm',
      from: 0,
      to: 1e6,
      default: '10 km',
      doc: 'Stations closer than this, and on a baseline below 0.1 Gλ, count as co-located.',
      why: 'Far below what a source that fits the field resolves.',
    },
    minimumSnr: {
      type: 'number',
      from: 0,
      default: 5,
      doc: 'Least signal-to-noise ratio of every visibility in a check.',
      why: 'Below 4 the cut itself biases log amplitudes; phases are no longer Gaussian below 3.',
    },
    least: {
      type: 'integer',
      from: 2,
      default: 10,
      doc: 'A check on fewer independent values is not made, and a warning says so.',
      why: 'Ten values give a scatter good to a quarter.',
    },
    closureScatter: scatterLimits(
      'Closure phases of triangles with two co-located stations, an independent set of every scan, with their full ' +
        'covariance: root of the reduced chi-square.',
    ),
    redundantPhases: scatterLimits(
      'Phases of far baselines seen by two co-located stations, their difference but for one phase per pair and scan, ' +
        'over the errors: root of the reduced chi-square.',
    ),
    redundantAmplitudes: scatterLimits(
      'The same for log amplitudes with one gain ratio per pair and scan: the closure amplitudes of the quadrangles that ' +
        'must be 1.',
    ),
    gainOffset: limits(
      'Mean log gain ratio of two co-located stations: the largest of all pairs, either sign.',
      0.2,
      0.6,
      'A good station is calibrated to 10 %, a poor one to 50 % (common practice).',
    ),
    gainScatter: limits(
      'Standard deviation of that ratio from scan to scan, less the noise: the largest of all pairs.',
      0.25,
      0.5,
      'Two stations good to 10 % give 0.14.',
    ),
    pairGainsOverTime: limits(
      'Log gain ratio of two co-located stations in two successive scans less its median over scans: the largest of all ' +
        'pairs, either sign, scaled down where a pair scatters more than 0.12. The baseline between the two says which is off.',
      0.4,
      0.45,
      'With stations good to 10 % the mean of two ratios scatters by 0.1, and the largest of some 25 is above 0.4 in one ' +
        'case of 600, above 0.45 in one of 6,000; half the gain is 0.69 off.',
    ),
    stationAmplitudes: limits(
      'Log amplitudes of all baselines of one station in two successive scans less those of the two scans before and after: ' +
        'the largest of all stations and scans, either sign, scaled down where a station scatters more than 0.11. Needs ' +
        'neither co-located stations nor a fit.',
      0.38,
      0.45,
      'With stations good to 10 % the largest of some 90 stayed below 0.36 in each of 200 invented observations; half the ' +
        'gain is 0.69 off.',
    ),
    closureTrends: limits(
      'Closure phases of triangles that must close against time, elevation and the Sun: the least likely rank correlation, ' +
        'in standard deviations of a normal value after allowing for the number of trials.',
      3,
      4,
      'Sound data are above 3 in one case of 370, above 4 in one of 16,000.',
    ),
    statedNoise: limits(
      'Scatter inside scans over the stated noise, the median over baselines and scans; needs the input `report`.',
      1.4,
      1.8,
      'Noise understated by a factor of 2 gives 2; of some hundred averages the median of sound data is 1 within a few per cent.',
    ),
    noiseByBaseline: limits(
      'The same by baseline: the largest over what the largest of so many has by chance in one case of ten; needs the ' +
        'input `report`. Phases that wander within scans raise it too.',
      1.3,
      1.5,
      'Sound data are below 1 in nine cases of ten; noise understated by a factor of 2 on baselines of ten scans and more gives 1.6 to 2.',
    ),
    otherAgreement: scatterLimits(
      'Closure phases and log closure amplitudes less those of the input `other`, over the errors of both: the largest ' +
        'of the robust scatter of all about zero, and that of the worst baseline less what the largest of so many may ' +
        'have above 1 by chance.',
    ),
    gainsOverTime: limits(
      "Log gains of the fit less their station's median: the largest of all stations and scans; needs the input `fitReport`.",
      0.4,
      0.55,
      'Of 200 gains good to 10 % the largest is 0.3 off; half the gain is 0.69 off.',
    ),
    baselinePhases: limits(
      'Degrees of the phase of one baseline that explains best what does not close, where it is more than four of its errors; needs the input `residuals`.',
      3,
      4.5,
      'The image takes up about half of such a phase: of 10 deg on one baseline 4.8 are left.',
    ),
    baselineAmplitudes: limits(
      'The same for its log amplitude.',
      0.15,
      0.3,
      'The image does not follow every amplitude: without any fault 0.1 is left on some baseline.',
    ),
    uvDifference: {
      type: 'number',
      from: 0,
      to: 0.5,
      default: 0.01,
      doc:
        'Largest relative difference of (u,v) at which a visibility is compared with the input `other`. Hands have the ' +
        'same (u,v), bands differ by the ratio of their frequencies.',
      why:
        'The source differs with (u,v): without any noise, bands 1 % apart saw closure phases of an invented ring of ' +
        '46 uas that differed by 1.4 deg in the median and 7 deg at most, and amplitudes by 4 %; at 2 % it was twice that.',
    },
    amplitudeBudget: {
      type: 'either',
      of: [
        {
          type: 'word',
          words: ['estimate'],
          doc: 'From the redundant amplitudes, or else from `other`: a lower bound.',
        },
        { type: 'number', from: 0, to: 1, doc: 'Fraction of the amplitude.' },
      ],
      default: 'estimate',
      doc: 'Systematic error of every amplitude, a fraction, added to sigma in quadrature.',
      why: 'The data say what they need.',
    },
    phaseBudget: {
      type: 'either',
      of: [
        {
          type: 'word',
          words: ['estimate'],
          doc: 'From the triangles that must close, or else from `other`: a lower bound.',
        },
        { type: 'quantity', unit: 'deg', from: 0, to: 180, doc: 'An angle.' },
      ],
      default: 'estimate',
      doc: 'Systematic error of every phase, added to its error in quadrature.',
      why: 'The data say what they need.',
    },
    outOfLimits: {
      type: 'word',
      words: ['stop', 'mark'],
      default: 'stop',
      doc: 'What a check out of limits does: end the run, or mark every plate that depends on this stage.',
      why: 'Nobody should publish such data without having said so.',
    },
  },
  outputs: {
    visibilities: { format: 'visibilities', doc: 'The visibilities with the error budget in their errors.' },
    report: {
      format: 'json',
      doc:
        'Findings, how often noise alone would exceed their limits, error budget with its intervals, numbers of closures, ' +
        'co-located pairs with their gain ratios by scan, station gains, trends, with `other` the agreement by baseline, ' +
        'with a fit its gains over time and the errors of single baselines.',
    },
  },
  load: () => import('./compute.ts'),
} as const satisfies StageKind;
