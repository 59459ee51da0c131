/**
 * Greatest and least value of a curve over an interval: dense sampling finds the hills, Brent's method climbs those that
 * can still win (R. P. Brent, Algorithms for Minimization without Derivatives, Prentice-Hall 1973, ch. 5).
 */

/** Values at every x; not a number where the curve is undefined. */
export type Curve = (x: Float64Array) => Float64Array;

export interface Extreme {
  readonly at: number;
  readonly value: number;
}

/** Golden section alone shrinks a bracket by 0.618 a step: 60 steps leave 3e-13 of it. */
const MOST_STEPS = 60;
/** Of the bracket. A smooth extreme is then met to the square of it. */
const POSITION_TOLERANCE = 1e-8;
const GOLDEN = (3 - Math.sqrt(5)) / 2;

/**
 * Least value of `f` within [low, high] from a bracket that samples suggest. Stops at the cap with what it has: the
 * bracket only shrinks, and the value returned was computed, never extrapolated.
 */
export function refineLeast(f: (x: number) => number, low: number, high: number, start: number): Extreme {
  let a = low;
  let b = high;
  let x = start;
  let fx = f(x);
  let w = x;
  let fw = fx;
  let v = x;
  let fv = fx;
  let step = 0;
  let before = 0;
  const tolerance = POSITION_TOLERANCE * (high - low);
  for (let i = 0; i < MOST_STEPS; i++) {
    const middle = (a + b) / 2;
    if (Math.abs(x - middle) <= 2 * tolerance - (b - a) / 2) break;
    let golden = true;
    if (Math.abs(before) > tolerance) {
      // the parabola through x, w, v
      const r = (x - w) * (fx - fv);
      const q0 = (x - v) * (fx - fw);
      const p0 = (x - v) * q0 - (x - w) * r;
      const twice = 2 * (q0 - r);
      const p = twice > 0 ? -p0 : p0;
      const q = Math.abs(twice);
      if (Math.abs(p) < Math.abs((q * before) / 2) && p > q * (a - x) && p < q * (b - x)) {
        golden = false;
        before = step;
        step = p / q;
      }
    }
    if (golden) {
      before = x < middle ? b - x : a - x;
      step = GOLDEN * before;
    }
    const u = x + (Math.abs(step) >= tolerance ? step : Math.sign(step) * tolerance);
    const fu = f(u);
    if (fu <= fx) {
      if (u < x) b = x;
      else a = x;
      [v, fv, w, fw, x, fx] = [w, fw, x, fx, u, fu];
      continue;
    }
    if (u < x) a = u;
    else b = u;
    if (fu <= fw || w === x) [v, fv, w, fw] = [w, fw, u, fu];
    else if (fu <= fv || v === x || v === w) [v, fv] = [u, fu];
  }
  return { at: x, value: fx };
}

/** A smooth hill rises above its highest sample by less than that sample stands above its lower neighbour. */
function lowerBound(values: Float64Array, i: number): number {
  const value = values[i]!;
  const left = values[i - 1] ?? value;
  const right = values[i + 1] ?? value;
  return value - Math.max(left - value, right - value, 0);
}

/**
 * What rounding does to a power |E|² ≤ 1 of a field with error 1e-15, and to any other curve relative to its size. A flat
 * or dark response is all hollows of this depth, and none of them is worth a descent.
 */
function roundingOf(value: number): number {
  const size = Math.abs(value);
  return 1e-14 * Math.max(size, Math.sqrt(size)) + 1e-28;
}

/**
 * Descents of one search. A response of 32 rings has fewer hollows than this; if noise of another kind makes more, the
 * lowest are descended into and the samples of the others stand as they are.
 */
const MOST_DESCENTS = 256;

function leastOf(curve: Curve, x: Float64Array, values: Float64Array): Extreme | null {
  const hollows: number[] = [];
  for (let i = 0; i < x.length; i++) {
    const value = values[i]!;
    if (Number.isNaN(value)) continue;
    if (value <= (values[i - 1] ?? value) && value <= (values[i + 1] ?? value)) hollows.push(i);
  }
  hollows.sort((i, j) => values[i]! - values[j]!);
  const [first] = hollows;
  if (first === undefined) return null;
  const one = new Float64Array(1);
  const at = (position: number) => {
    one[0] = position;
    const [value] = curve(one);
    return value === undefined || Number.isNaN(value) ? Number.POSITIVE_INFINITY : value;
  };
  let best: Extreme = { at: x[first]!, value: values[first]! };
  let descents = 0;
  for (const i of hollows) {
    if (lowerBound(values, i) >= best.value - roundingOf(best.value)) continue;
    if (++descents > MOST_DESCENTS) break;
    const refined = refineLeast(at, x[i - 1] ?? x[i]!, x[i + 1] ?? x[i]!, x[i]!);
    if (refined.value < best.value) best = refined;
  }
  return best;
}

/**
 * Extremes of a curve sampled at ascending `x` (and, between the samples, wherever `curve` is asked). Null where it is
 * undefined at every sample. Cost: one evaluation at all samples, then about 15 for every hill that can still win.
 */
export function extremesOf(curve: Curve, x: Float64Array): { greatest: Extreme; least: Extreme } | null {
  const values = curve(x);
  const least = leastOf(curve, x, values);
  const turned = leastOf(
    (at) => curve(at).map((value) => -value),
    x,
    values.map((value) => -value),
  );
  if (least === null || turned === null) return null;
  return { least, greatest: { at: turned.at, value: -turned.value } };
}
