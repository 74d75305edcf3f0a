/** What an array does to visibilities: station gains and phases, errors of baselines, thermal noise. Each has a stream
 *  of random numbers of its own, and stations draw whether they observe or not, so that one setting does not change
 *  what another draws. */

import type { UvHand } from '../formats/uv-groups-write.ts';
import { cos, exp, ln, sin } from '../numerics/elementary.ts';
import { radiometerSigma } from '../numerics/noise.ts';
import { randomStream } from '../numerics/random.ts';
import type { Simulation } from './parameters.ts';
import type { Tracks } from './tracks.ts';

export interface Hands {
  readonly rr: UvHand;
  readonly ll: UvHand;
}

/** Observed visibilities of both hands: V_ij g_i g_j exp(i(φ_i − φ_j)) times the baseline's own error, plus noise.
 *  @param re, im  true visibilities by row of the tracks, Jy */
export function observe(simulation: Simulation, tracks: Tracks, re: Float64Array, im: Float64Array): Hands {
  const { count, station1, station2, scan } = tracks;
  const station = drawStationErrors(simulation, tracks.scans);
  const baseline = drawBaselineErrors(simulation, tracks.scans);
  const noise = randomStream(simulation.seed, 'thermal noise');
  const n = simulation.stations.length;
  const planted = plantedFaults(simulation);
  const hands = makeHands(count);
  for (let k = 0; k < count; k++) {
    const [i, j] = [station1[k], station2[k]];
    const [a, b] = [scan[k] * n + i, scan[k] * n + j];
    const pair = (scan[k] * n + i) * n + j;
    const fault = planted(tracks.timeMjd[k], i, j);
    const gain = exp(station.logGain[a] + station.logGain[b] + baseline.logGain[pair] + fault.logGain);
    const phase = station.phase[a] - station.phase[b] + baseline.phase[pair] + fault.phase;
    const [c, s] = [gain * cos(phase), gain * sin(phase)];
    const vRe = c * re[k] - s * im[k];
    const vIm = s * re[k] + c * im[k];
    const sigma = rowSigma(simulation, i, j);
    const drawn = sigma * simulation.noiseFactor * fault.noise;
    for (const hand of [hands.rr, hands.ll]) {
      hand.re[k] = vRe + drawn * noise.normal();
      hand.im[k] = vIm + drawn * noise.normal();
      hand.weight[k] = 1 / (sigma * sigma);
    }
  }
  return hands;
}

/** What planted faults add to the log gain and the phase of a baseline at a time, and multiply its noise by. */
function plantedFaults({ faults, stations, startMjd }: Simulation) {
  const index = (name: string | undefined) => stations.findIndex((station) => station.name === name);
  const active = faults.map((fault) => ({ ...fault, a: index(fault.station), b: index(fault.other) }));
  return (mjd: number, i: number, j: number) => {
    let [logGain, phase, noise] = [0, 0, 1];
    const hours = (mjd - startMjd) * 24;
    for (const { fault, from, duration, value, a, b } of active) {
      if (hours < from || hours >= from + duration) continue;
      if (fault === 'gain-drop' && (a === i || a === j)) logGain += ln(value);
      if (fault === 'non-closing-phase' && ((a === i && b === j) || (a === j && b === i))) {
        phase += (a === i ? 1 : -1) * ((value * Math.PI) / 180);
      }
      // Without stations of all baselines, with one of its own, with two of the one between them.
      if (fault === 'noise-understated' && [a, b].every((k) => k < 0 || k === i || k === j)) noise *= value;
    }
    return { logGain, phase, noise };
  };
}

function rowSigma(simulation: Simulation, i: number, j: number): number {
  const { stations, bandwidth, record, quantisationEfficiency } = simulation;
  return radiometerSigma(stations[i].sefd, stations[j].sefd, bandwidth, record, quantisationEfficiency);
}

interface Errors {
  readonly logGain: Float64Array;
  /** Radians. */
  readonly phase: Float64Array;
}

/** By scan, then by station. */
function drawStationErrors(simulation: Simulation, scans: number): Errors {
  const gains = randomStream(simulation.seed, 'station gains');
  const phases = randomStream(simulation.seed, 'station phases');
  const { stations, phasesUnknown } = simulation;
  const length = scans * stations.length;
  return {
    logGain: Float64Array.from({ length }, (_, k) => {
      const { gainError, gainFactor } = stations[k % stations.length];
      return ln(gainFactor) + gainError * gains.normal();
    }),
    phase: Float64Array.from({ length }, () => {
      const drawn = phases.between(-Math.PI, Math.PI);
      return phasesUnknown ? drawn : 0;
    }),
  };
}

/** By scan, then by first and second station. */
function drawBaselineErrors(simulation: Simulation, scans: number): Errors {
  const stream = randomStream(simulation.seed, 'baseline errors');
  const { amplitude, phase } = simulation.nonClosing;
  const length = scans * simulation.stations.length * simulation.stations.length;
  const errors = { logGain: new Float64Array(length), phase: new Float64Array(length) };
  for (let k = 0; k < length; k++) {
    errors.logGain[k] = amplitude * stream.normal();
    errors.phase[k] = phase * stream.normal();
  }
  return errors;
}

function makeHands(count: number): Hands {
  const hand = () => ({
    re: new Float32Array(count),
    im: new Float32Array(count),
    weight: new Float32Array(count),
  });
  return { rr: hand(), ll: hand() };
}
