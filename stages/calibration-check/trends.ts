/** Closure phases that must be zero against the Sun, the elevation of the stations and time. No source makes such a
 *  trend; an instrument that warms in the Sun, leaks with elevation or drifts does.
 *
 *  Rank correlations (rank-correlation.ts), which need no form of the trend: of every triangle's closure phases, and of
 *  the mean square of all of a scan over their errors, with time, with the lowest elevation among the stations and with
 *  the highest elevation of the Sun among them. The finding is the least likely of all, in standard deviations of a
 *  normal value after allowing for the number of trials (Šidák). Where the Sun stands is good to 0.01 degrees. */

import type { Visibilities } from '../data.ts';
import type { Closure } from '../numerics/closures.ts';
import { elevation, geodetic } from '../numerics/geodesy.ts';
import { type RankCorrelation, rankCorrelation } from '../numerics/rank-correlation.ts';
import { mean } from '../numerics/statistics.ts';
import { separation, sunAt } from '../numerics/sun.ts';
import { deviationsOf, normalTail, ofTrials } from '../numerics/tails.ts';
import { gmst1982 } from '../numerics/time.ts';
import { whitened } from './agreement.ts';
import type { Measured, Outcome } from './checks.ts';
import { judge } from './findings.ts';
import type { CheckParameters } from './parameters.ts';

/** Fewer scans give no rank correlation that could be significant after some ten trials. */
const LEAST_SCANS = 8;
const DEGREE = Math.PI / 180;

const REGRESSORS = ['time', 'elevation', 'sun'] as const;
type Regressor = (typeof REGRESSORS)[number];
const WORDS: Readonly<Record<Regressor, string>> = {
  time: 'time',
  elevation: 'the lowest elevation of its stations',
  sun: "the Sun's elevation",
};

/** One closure phase with its circumstances: days; radians. */
interface Point extends Readonly<Record<Regressor, number>> {
  readonly label: string;
  readonly scan: number;
  readonly value: number;
}

export interface Trend {
  readonly of: string;
  readonly against: Regressor;
  readonly scans: number;
  readonly correlation: RankCorrelation;
}

export interface Trends {
  readonly trends: readonly Trend[];
  /** Degrees between target and Sun, least over the observation; null without rows. */
  readonly sunDistanceDegrees: number | null;
}

export function measureTrends(visibilities: Visibilities, measured: Measured): Trends {
  const points = pointsOf(
    visibilities,
    measured.triangles,
    measured.triangleGroups.flatMap((g) => g.values),
  );
  const labels = [...new Set(points.map(({ label }) => label))];
  const signed = labels.flatMap((label) =>
    trendsOf(
      label,
      points.filter((point) => point.label === label),
    ),
  );
  const sizes = trendsOf('mean square of all over their errors', scanSizes(points, measured));
  return { trends: [...signed, ...sizes], sunDistanceDegrees: sunDistance(visibilities) };
}

export function checkTrends({ trends }: Trends, { limits }: CheckParameters): Outcome {
  const check = 'closureTrends';
  if (trends.length === 0) {
    const tooLittle = `no triangle with two co-located stations in ${LEAST_SCANS} scans`;
    return { check, tooLittle };
  }
  const worst = trends.reduce((a, b) => (b.correlation.probability < a.correlation.probability ? b : a));
  const { tau, probability } = worst.correlation;
  const value = deviationsOf(ofTrials(probability, trends.length));
  const detail =
    `Rank correlations of closure phases that must be zero with time, elevation and the Sun, the least likely of ${trends.length} in standard ` +
    `deviations: ${worst.of} against ${WORDS[worst.against]}, tau ${tau.toFixed(2)} over ${worst.scans} scans.`;
  return judge(check, value, limits.closureTrends, detail, (limit) => 2 * normalTail(limit));
}

function trendsOf(of: string, points: readonly Readonly<Record<Regressor | 'value', number>>[]): Trend[] {
  if (points.length < LEAST_SCANS) return [];
  const values = points.map(({ value }) => value);
  return REGRESSORS.flatMap((against) => {
    const x = points.map((point) => point[against]);
    // Without known positions there is no elevation.
    if (!x.every(Number.isFinite)) return [];
    return [{ of, against, scans: points.length, correlation: rankCorrelation(x, values) }];
  });
}

/** By scan: the mean square of what must be zero, freed of what closures share. */
function scanSizes(points: readonly Point[], { triangleGroups }: Measured) {
  const scans = [...new Set(points.map(({ scan }) => scan))];
  return scans.map((scan, k) => {
    const own = points.filter((point) => point.scan === scan);
    const group = triangleGroups[k];
    const squares = Array.from(whitened(group, group.values), (value) => value * value);
    return {
      value: mean(squares),
      time: mean(own.map(({ time }) => time)),
      elevation: Math.min(...own.map((point) => point.elevation)),
      sun: Math.max(...own.map(({ sun }) => sun)),
    };
  });
}

/** @param values  of the triangles, in their order */
function pointsOf(
  visibilities: Visibilities,
  triangles: readonly Closure[],
  values: readonly number[],
): Point[] {
  const { stations, station1, station2, timeMjd, scan } = visibilities;
  return triangles.map(({ rows }, k) => {
    const own = [station1[rows[0]], station2[rows[0]], station2[rows[1]]];
    const time = timeMjd[rows[0]];
    const heights = own.map((station) => elevationsAt(visibilities, station, time));
    return {
      label: own.map((station) => stations[station].name).join('–'),
      scan: scan[rows[0]],
      value: values[k],
      time,
      elevation: Math.min(...heights.map(({ target }) => target)),
      sun: Math.max(...heights.map(({ sun }) => sun)),
    };
  });
}

/** Elevations of target and Sun above a station, radians; NaN where its position is not known. */
function elevationsAt({ stations, target }: Visibilities, station: number, mjd: number) {
  const { xyz } = stations[station];
  if (xyz.every((coordinate) => coordinate === 0)) return { target: Number.NaN, sun: Number.NaN };
  const { latitude, longitude } = geodetic(xyz);
  const local = gmst1982(mjd) + longitude;
  const sun = sunAt(mjd);
  return {
    target: elevation(latitude, target.decDegrees * DEGREE, local - target.raDegrees * DEGREE),
    sun: elevation(latitude, sun.dec, local - sun.ra),
  };
}

function sunDistance({ target, timeMjd }: Visibilities): number | null {
  if (timeMjd.length === 0) return null;
  const place = { ra: target.raDegrees * DEGREE, dec: target.decDegrees * DEGREE };
  const [first, last] = [timeMjd[0], timeMjd[timeMjd.length - 1]];
  return Math.min(...[first, last].map((mjd) => separation(place, sunAt(mjd)) / DEGREE));
}

/** What the report says: every correlation. */
export function trendsReport({ trends, sunDistanceDegrees }: Trends) {
  return {
    sunDistanceDegrees,
    correlations: trends.map(({ of, against, scans, correlation }) => ({
      of,
      against,
      scans,
      tau: correlation.tau,
      probability: correlation.probability,
    })),
  };
}
