/** Power transmission of a source, its extremes over bands, and its peak over one FSR. */
import { FLOOR_DB } from '../conventions.ts';
import type { IntervalGhz } from '../filter/specification.ts';
import { type Curve, type Extreme, extremesOf } from './extremes.ts';
import { sampleOffsets } from './sampling.ts';
import type { FieldSource } from './source.ts';

export function powerOf(source: FieldSource): Curve {
  return (offsetGhz) => {
    const re = new Float64Array(offsetGhz.length);
    const im = new Float64Array(offsetGhz.length);
    source.fieldInto(offsetGhz, re, im);
    for (let i = 0; i < re.length; i++) re[i] = re[i]! * re[i]! + im[i]! * im[i]!;
    return re;
  };
}

/** 10·log₁₀ of a power, not below FLOOR_DB. */
export function toDb(power: number): number {
  return power > 0 ? Math.max(FLOOR_DB, 10 * Math.log10(power)) : FLOOR_DB;
}

/** The part of a band that is judged: the band, or one FSR of it where it is wider. */
export function withinOneFsr({ lowGhz, highGhz }: IntervalGhz, fsrGhz: number): IntervalGhz {
  return highGhz - lowGhz > fsrGhz ? { lowGhz, highGhz: lowGhz + fsrGhz } : { lowGhz, highGhz };
}

/** Least and greatest power within one band; `at` in GHz. */
export function powerExtremes(source: FieldSource, band: IntervalGhz): { greatest: Extreme; least: Extreme } {
  const { lowGhz, highGhz } = withinOneFsr(band, source.fsrGhz);
  const found = extremesOf(powerOf(source), sampleOffsets(source, lowGhz, highGhz));
  if (found === null) throw new RangeError('the field is not a number anywhere in the band');
  return found;
}

/** Least and greatest power over one FSR around `centreGhz`. */
export function powerExtremesOverFsr(source: FieldSource, centreGhz = 0) {
  const half = source.fsrGhz / 2;
  return powerExtremes(source, { lowGhz: centreGhz - half, highGhz: centreGhz + half });
}

/** Least and greatest power over several bands; null where there are none. */
export function powerExtremesOver(source: FieldSource, bands: readonly IntervalGhz[]) {
  const found = bands.map((band) => powerExtremes(source, band));
  const [first, ...rest] = found;
  if (first === undefined) return null;
  return rest.reduce(
    (sum, next) => ({
      greatest: next.greatest.value > sum.greatest.value ? next.greatest : sum.greatest,
      least: next.least.value < sum.least.value ? next.least : sum.least,
    }),
    first,
  );
}
