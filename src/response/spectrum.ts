/** Curves over a grid of offsets, and what follows from them. */
import { NM_THZ } from '../conventions.ts';
import type { IntervalGhz } from '../filter/specification.ts';
import type { Spectrum } from './response.ts';
import type { FieldSource } from './source.ts';
import { powerExtremesOverFsr, toDb } from './transmission.ts';

/** Group delay and dispersion are no figures where less than this share of the peak is left: 60 dB below it. */
const LEAST_SHARE_OF_PEAK = 1e-6;

/**
 * Field, group delay and its slope of one output.
 * @param offsetGhz offsets from the reference frequency, GHz, ascending
 *
 * Delay and slope are NaN more than 60 dB below the peak over one FSR. Cost: one kernel evaluation with derivatives,
 * and the search for the peak.
 */
export function spectrumOf(source: FieldSource, offsetGhz: Float64Array): Spectrum {
  const n = offsetGhz.length;
  const re = new Float64Array(n);
  const im = new Float64Array(n);
  const groupDelayPs = new Float64Array(n);
  const groupDelaySlopePsPerGhz = new Float64Array(n);
  source.fieldInto(offsetGhz, re, im);
  source.groupDelayInto(offsetGhz, groupDelayPs, groupDelaySlopePsPerGhz);
  const least = LEAST_SHARE_OF_PEAK * powerExtremesOverFsr(source).greatest.value;
  for (let i = 0; i < n; i++) {
    if (re[i]! * re[i]! + im[i]! * im[i]! > least) continue;
    groupDelayPs[i] = Number.NaN;
    groupDelaySlopePsPerGhz[i] = Number.NaN;
  }
  return { offsetGhz, re, im, groupDelayPs, groupDelaySlopePsPerGhz };
}

/** Transmission in dB (power), not below FLOOR_DB. */
export function transmissionDb({ re, im }: Spectrum): Float64Array {
  return re.map((value, i) => toDb(value * value + im[i]! * im[i]!));
}

/** Phase of the field in (−π, π], rad. */
export function phaseRad({ re, im }: Spectrum): Float64Array {
  return re.map((value, i) => Math.atan2(im[i]!, value));
}

/**
 * Chromatic dispersion D = dτ/dλ in ps/nm, by vacuum wavelength: D = −(ν²/c)·dτ/dν, from the analytic slope of the
 * delay. NaN where the delay is.
 */
export function dispersionPsPerNm(spectrum: Spectrum, referenceFrequencyThz: number): Float64Array {
  return spectrum.groupDelaySlopePsPerGhz.map((slope, i) => {
    const frequencyThz = referenceFrequencyThz + spectrum.offsetGhz[i]! * 1e-3;
    return (-(frequencyThz * frequencyThz) / NM_THZ) * slope * 1e3;
  });
}

/** Runs of the grid where group delay and dispersion are undefined. */
export function gapsOf({ offsetGhz, groupDelayPs }: Spectrum): IntervalGhz[] {
  const gaps: IntervalGhz[] = [];
  let first = -1;
  for (let i = 0; i <= offsetGhz.length; i++) {
    const gap = i < offsetGhz.length && Number.isNaN(groupDelayPs[i]!);
    if (gap && first < 0) first = i;
    if (gap || first < 0) continue;
    gaps.push({ lowGhz: offsetGhz[first]!, highGhz: offsetGhz[i - 1]! });
    first = -1;
  }
  return gaps;
}
