/** Fewer points for a plot or a wire, without losing a notch or a spike. */

/** Least and greatest sample of every bucket, with its offset. */
export interface ReducedCurve {
  readonly x: Float64Array;
  readonly y: Float64Array;
}

/**
 * At most `points` samples of a curve: its grid is cut into buckets of equal count, and each gives its least and its
 * greatest value, in the order in which they stand. First and last sample are always kept. Values that are not a
 * number are passed over; a bucket of nothing else gives one of them, so that a gap stays a gap.
 * @param points at least 4
 */
export function reduceTo(x: Float64Array, y: Float64Array, points: number): ReducedCurve {
  if (!(points >= 4)) throw new RangeError(`points is ${points}, below 4`);
  const n = x.length;
  if (n <= points) return { x: x.slice(), y: y.slice() };
  const buckets = Math.floor((points - 2) / 2);
  const kept: number[] = [0];
  for (let b = 0; b < buckets; b++) {
    const from = 1 + Math.floor((b * (n - 2)) / buckets);
    const to = 1 + Math.floor(((b + 1) * (n - 2)) / buckets);
    kept.push(...extremesWithin(y, from, to));
  }
  kept.push(n - 1);
  return { x: Float64Array.from(kept, (i) => x[i]!), y: Float64Array.from(kept, (i) => y[i]!) };
}

function extremesWithin(y: Float64Array, from: number, to: number): number[] {
  let least = -1;
  let greatest = -1;
  for (let i = from; i < to; i++) {
    if (Number.isNaN(y[i]!)) continue;
    if (least < 0 || y[i]! < y[least]!) least = i;
    if (greatest < 0 || y[i]! > y[greatest]!) greatest = i;
  }
  if (least < 0) return [from];
  if (least === greatest) return [least];
  return least < greatest ? [least, greatest] : [greatest, least];
}
