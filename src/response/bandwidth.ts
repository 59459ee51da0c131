/** Width of the connected span around a centre in which a response stays within so many dB of its peak. */
import { refineLeast } from './extremes.ts';
import { sampleOffsets } from './sampling.ts';
import type { FieldSource } from './source.ts';
import { powerOf } from './transmission.ts';

export type Bandwidth = { readonly widthGhz: number } | { readonly reason: string };

/** Bisection of one sample interval down to the last bit of its ends. */
const MOST_HALVINGS = 52;

type Side = -1 | 1;

interface Samples {
  readonly x: Float64Array;
  readonly power: Float64Array;
}

function crossing(at: (x: number) => number, inside: number, outside: number, level: number): number {
  let a = inside;
  let b = outside;
  for (let i = 0; i < MOST_HALVINGS; i++) {
    const middle = (a + b) / 2;
    if (middle === a || middle === b) break;
    if (at(middle) >= level) a = middle;
    else b = middle;
  }
  return (a + b) / 2;
}

/** Where the response first falls below the level on one side of sample `start`; null when it does not. */
function edge(
  { x, power }: Samples,
  at: (x: number) => number,
  start: number,
  side: Side,
  level: number,
): number | null {
  for (let i = start; i >= 0 && i < x.length; i += side) {
    const before = x[i - side];
    if (power[i]! < level) return crossing(at, before ?? x[i]!, x[i]!, level);
    const left = power[i - 1];
    const right = power[i + 1];
    if (left === undefined || right === undefined || i === start) continue;
    // a dip between two samples that both pass: its depth is at most what the sample lies below its neighbours
    const value = power[i]!;
    if (value > left || value > right || value - Math.max(left - value, right - value) >= level) continue;
    const dip = refineLeast(at, x[i - 1]!, x[i + 1]!, x[i]!);
    if (dip.value < level) return crossing(at, x[i - side]!, dip.at, level);
  }
  return null;
}

/**
 * @param dropDb how far below the peak, dB > 0
 * @param peakPower greatest power of the output over one FSR
 * @returns the width, or why there is none
 */
export function bandwidthOf(
  source: FieldSource,
  centreGhz: number,
  dropDb: number,
  peakPower: number,
): Bandwidth {
  const curve = powerOf(source);
  const one = new Float64Array(1);
  const at = (x: number): number => {
    one[0] = x;
    return curve(one)[0]!;
  };
  const level = peakPower * 10 ** (-dropDb / 10);
  if (!(at(centreGhz) >= level)) return { reason: `the centre lies more than ${dropDb} dB below the peak` };
  const half = source.fsrGhz / 2;
  const upper = sampleOffsets(source, centreGhz, centreGhz + half);
  const lower = sampleOffsets(source, centreGhz - half, centreGhz);
  const high = edge({ x: upper, power: curve(upper) }, at, 0, 1, level);
  const low = edge({ x: lower, power: curve(lower) }, at, lower.length - 1, -1, level);
  if (high !== null && low !== null) return { widthGhz: high - low };
  if (high === null && low === null)
    return { reason: `the response stays within ${dropDb} dB of its peak over the whole FSR` };
  return { reason: `the response falls by ${dropDb} dB on one side of the centre only` };
}
