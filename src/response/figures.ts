/**
 * The figures of a response, each a number, or null with the reason. All of one output, over one FSR, both sides of the
 * centre. Insertion loss: −(greatest transmission in the passband), against the light sent in. Ripple: greatest − least
 * there. Rejection: greatest in the passband − greatest in the stopband. Extinction ratio: greatest − least over the FSR.
 * −x dB bandwidth: width of the connected span around the centre within x dB of the peak. Neighbour isolation: least of
 * the own output in its channel window − greatest of the other output there, the worst window counting.
 */
import { FLOOR_DB } from '../conventions.ts';
import type { IntervalGhz } from '../filter/specification.ts';
import { type Bandwidth, bandwidthOf } from './bandwidth.ts';
import { extremesOf } from './extremes.ts';
import type { Figures } from './response.ts';
import { sampleOffsets } from './sampling.ts';
import type { FieldSource } from './source.ts';
import {
  powerExtremes,
  powerExtremesOver,
  powerExtremesOverFsr,
  powerOf,
  toDb,
  withinOneFsr,
} from './transmission.ts';

/** Where an output passes and stops. */
export interface FigureBands {
  readonly passbands: readonly IntervalGhz[];
  readonly stopbands: readonly IntervalGhz[];
  /** Passbands of the other output: its channel windows. */
  readonly otherPassbands?: readonly IntervalGhz[];
  readonly centreGhz: number;
}

/** Group delay counts down to 60 dB below the peak. */
const LEAST_SHARE_OF_PEAK = 1e-6;

/** A level this low is a null; its depth is set by rounding and is no figure. */
const NULL_DB = FLOOR_DB;

type Value = { readonly value: number } | { readonly reason: string };
type FigureName = Exclude<keyof Figures, 'notDefined'>;

const NO_PASSBAND = 'no passband is stated';

function insertionLoss(pass: ReturnType<typeof powerExtremesOver>): Value {
  if (pass === null) return { reason: NO_PASSBAND };
  const greatest = toDb(pass.greatest.value);
  return greatest <= NULL_DB ? { reason: 'nothing is transmitted in the passband' } : { value: -greatest };
}

/** A dip further below the peak than this is a null on any real chip: how deep is a matter of luck. */
const NULL_BELOW_PEAK_DB = 60;

function extinctionRatio(peak: number, leastPower: number): Value {
  const ratioDb = toDb(peak) - toDb(leastPower);
  if (ratioDb <= NULL_BELOW_PEAK_DB) return { value: ratioDb };
  return {
    reason: `the least transmission is a null, more than ${NULL_BELOW_PEAK_DB} dB below the peak; the depth of a null is no figure`,
  };
}

function difference(greatestPower: number, leastPower: number, what: string): Value {
  const least = toDb(leastPower);
  if (least <= NULL_DB) return { reason: `${what} is a null, and the depth of a null is no figure` };
  return { value: toDb(greatestPower) - least };
}

function rejection(
  source: FieldSource,
  bands: FigureBands,
  pass: ReturnType<typeof powerExtremesOver>,
): Value {
  if (pass === null) return { reason: NO_PASSBAND };
  const stop = powerExtremesOver(source, bands.stopbands);
  if (stop === null) return { reason: 'no stopband is stated' };
  return difference(pass.greatest.value, stop.greatest.value, 'the greatest transmission in the stopband');
}

function groupDelayRipple(source: FieldSource, passbands: readonly IntervalGhz[], peakPower: number): Value {
  const power = powerOf(source);
  const delay = (offsetGhz: Float64Array) => {
    const ps = new Float64Array(offsetGhz.length);
    source.groupDelayInto(offsetGhz, ps);
    const p = power(offsetGhz);
    return ps.map((value, i) => (p[i]! > LEAST_SHARE_OF_PEAK * peakPower ? value : Number.NaN));
  };
  let least = Number.POSITIVE_INFINITY;
  let greatest = Number.NEGATIVE_INFINITY;
  for (const band of passbands) {
    const { lowGhz, highGhz } = withinOneFsr(band, source.fsrGhz);
    const found = extremesOf(delay, sampleOffsets(source, lowGhz, highGhz));
    if (found === null) continue;
    least = Math.min(least, found.least.value);
    greatest = Math.max(greatest, found.greatest.value);
  }
  if (passbands.length === 0) return { reason: NO_PASSBAND };
  if (!(greatest >= least)) return { reason: 'the passband lies more than 60 dB below the peak' };
  return { value: greatest - least };
}

function neighbourIsolation(source: FieldSource, other: FieldSource | null, bands: FigureBands): Value {
  if (other === null) return { reason: 'the other output is not given' };
  const windows = [
    ...bands.passbands.map((band) => ({ band, own: source, neighbour: other })),
    ...(bands.otherPassbands ?? []).map((band) => ({ band, own: other, neighbour: source })),
  ];
  if (windows.length === 0) return { reason: NO_PASSBAND };
  let worst = Number.POSITIVE_INFINITY;
  for (const { band, own, neighbour } of windows) {
    const leak = powerExtremes(neighbour, band).greatest.value;
    if (toDb(leak) <= NULL_DB) continue;
    worst = Math.min(worst, toDb(powerExtremes(own, band).least.value) - toDb(leak));
  }
  if (worst === Number.POSITIVE_INFINITY) return { reason: 'the other output has a null there' };
  return { value: worst };
}

const widthValue = (width: Bandwidth): Value => ('widthGhz' in width ? { value: width.widthGhz } : width);

function shapeFactor(width20: Bandwidth, width1: Bandwidth): Value {
  if ('reason' in width1) return { reason: `no −1 dB bandwidth: ${width1.reason}` };
  if ('reason' in width20) return { reason: `no −20 dB bandwidth: ${width20.reason}` };
  return { value: width20.widthGhz / width1.widthGhz };
}

/**
 * @param other the other output of the same circuit, null where there is none
 * @param bands where this output passes and stops; usually from the mask
 *
 * Extremes are searched for between samples that resolve every pole. Cost: a few evaluations of some thousand
 * frequencies each, a few milliseconds.
 */
export function figuresOf(source: FieldSource, other: FieldSource | null, bands: FigureBands): Figures {
  const overFsr = powerExtremesOverFsr(source, bands.centreGhz);
  const peak = overFsr.greatest.value;
  const pass = powerExtremesOver(source, bands.passbands);
  const width1 = bandwidthOf(source, bands.centreGhz, 1, peak);
  const width20 = bandwidthOf(source, bands.centreGhz, 20, peak);
  const values: Record<FigureName, Value> = {
    insertionLossDb: insertionLoss(pass),
    rippleDb:
      pass === null
        ? { reason: NO_PASSBAND }
        : difference(pass.greatest.value, pass.least.value, 'the least transmission in the passband'),
    rejectionDb: rejection(source, bands, pass),
    extinctionRatioDb: extinctionRatio(peak, overFsr.least.value),
    bandwidth1DbGhz: widthValue(width1),
    bandwidth3DbGhz: widthValue(bandwidthOf(source, bands.centreGhz, 3, peak)),
    bandwidth20DbGhz: widthValue(width20),
    shapeFactor: shapeFactor(width20, width1),
    groupDelayRipplePs: groupDelayRipple(source, bands.passbands, peak),
    worstNeighbourIsolationDb: neighbourIsolation(source, other, bands),
  };
  const names = Object.keys(values) as FigureName[];
  const numbers = Object.fromEntries(
    names.map((name) => {
      const entry = values[name];
      return [name, 'value' in entry ? entry.value : null];
    }),
  ) as Record<FigureName, number | null>;
  const notDefined = names.flatMap((figure) => {
    const entry = values[figure];
    return 'reason' in entry ? [{ figure, reason: entry.reason }] : [];
  });
  return { ...numbers, notDefined };
}
