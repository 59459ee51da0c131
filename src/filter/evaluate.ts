/**
 * Response of a filter in factored form on a grid of Ω. With u = e^{jΩ} − 1 = −2·sin²(Ω/2) + j·sin Ω every factor is
 * (1 − root) + u: both parts are exact where the bands of narrow filters lie, and only the rounding of the stored
 * root is left. A factor whose root is on the unit circle and near is taken as 2j·sin(d/2)·e^{j(Ω+θ)/2}, d = Ω − θ.
 */
import type { Complex } from 'complex.js';
import type { TransferFunction } from './transfer-function.ts';

/** A root this near to the unit circle is one on it that was rounded. */
const ON_CIRCLE = 1e-12;

/** Squared distance below which the difference of two numbers on the unit circle has lost digits worth having. */
const NEAR_SQUARED = 1e-4;

const isOnCircle = (root: Complex): boolean => Math.abs(Math.hypot(root.re, root.im) - 1) < ON_CIRCLE;

/** Per root: 1 − Re, −Im, and the angle where it lies on the unit circle (NaN elsewhere). */
function layOut(roots: readonly Complex[]): Float64Array {
  const flat = new Float64Array(3 * roots.length);
  for (let index = 0; index < roots.length; index++) {
    const root = roots[index]!;
    flat[3 * index] = 1 - root.re;
    flat[3 * index + 1] = -root.im;
    flat[3 * index + 2] = isOnCircle(root) ? Math.atan2(root.im, root.re) : Number.NaN;
  }
  return flat;
}

/** Π(e^{jΩ} − root) into out[0], out[1]; u = e^{jΩ} − 1. */
function productInto(
  flat: Float64Array,
  omegaRad: number,
  uRe: number,
  uIm: number,
  out: Float64Array,
): void {
  let re = 1;
  let im = 0;
  for (let at = 0; at < flat.length; at += 3) {
    let fRe = flat[at]! + uRe;
    let fIm = flat[at + 1]! + uIm;
    const angle = flat[at + 2]!;
    if (!Number.isNaN(angle) && fRe * fRe + fIm * fIm < NEAR_SQUARED) {
      const chord = 2 * Math.sin((omegaRad - angle) / 2);
      fRe = -chord * Math.sin((omegaRad + angle) / 2);
      fIm = chord * Math.cos((omegaRad + angle) / 2);
    }
    const next = re * fRe - im * fIm;
    im = re * fIm + im * fRe;
    re = next;
  }
  out[0] = re;
  out[1] = im;
}

/**
 * H(e^{jΩ}) at every `omegaRad` (any real numbers) into `re` and `im` (same length, overwritten). O(points · order),
 * nothing allocated per point. Error about 1e-15 · order, plus the rounding of poles, 1e-16 / (1 − |pole|) each.
 */
export function evaluateInto(
  filter: TransferFunction,
  omegaRad: Float64Array,
  re: Float64Array,
  im: Float64Array,
): void {
  const zeros = layOut(filter.zeros);
  const poles = layOut(filter.poles);
  const top = new Float64Array(2);
  const bottom = new Float64Array(2);
  for (let point = 0; point < omegaRad.length; point++) {
    const omega = omegaRad[point]!;
    const half = Math.sin(omega / 2);
    const uRe = -2 * half * half;
    const uIm = 2 * half * Math.cos(omega / 2);
    productInto(zeros, omega, uRe, uIm, top);
    productInto(poles, omega, uRe, uIm, bottom);
    const tRe = top[0]! * filter.gain.re - top[1]! * filter.gain.im;
    const tIm = top[0]! * filter.gain.im + top[1]! * filter.gain.re;
    const scale = 1 / (bottom[0]! * bottom[0]! + bottom[1]! * bottom[1]!);
    re[point] = (tRe * bottom[0]! + tIm * bottom[1]!) * scale;
    im[point] = (tIm * bottom[0]! - tRe * bottom[1]!) * scale;
  }
}

/** Power transmission |H(e^{jΩ})|² at one Ω, linear. */
export function transmissionAt(filter: TransferFunction, omegaRad: number): number {
  const omega = new Float64Array([omegaRad]);
  const re = new Float64Array(1);
  const im = new Float64Array(1);
  evaluateInto(filter, omega, re, im);
  return re[0]! * re[0]! + im[0]! * im[0]!;
}

/** Per root that is not on the unit circle: 1 − Re, −Im, and ±(1 − |root|²)/2, + for poles. */
function layOutDelays(filter: TransferFunction): Float64Array {
  const flat: number[] = [];
  const add = (root: Complex, sign: number): void => {
    const radius = Math.hypot(root.re, root.im);
    flat.push(1 - root.re, -root.im, (sign * (1 - radius) * (1 + radius)) / 2);
  };
  for (const pole of filter.poles) add(pole, 1);
  for (const zero of filter.zeros) if (!isOnCircle(zero)) add(zero, -1);
  return Float64Array.from(flat);
}

/**
 * Group delay −dφ/dΩ in unit delays at every `omegaRad` into `delay`. A factor (e^{jΩ} − root) turns by
 * ½ + (1 − |root|²)/(2·|e^{jΩ} − root|²); one on the unit circle by ½ alone (the phase jump at the null itself is not
 * a delay). O(points · order), nothing allocated per point.
 */
export function groupDelayInto(filter: TransferFunction, omegaRad: Float64Array, delay: Float64Array): void {
  const flat = layOutDelays(filter);
  const halves = (filter.poles.length - filter.zeros.length) / 2;
  for (let point = 0; point < omegaRad.length; point++) {
    const half = Math.sin(omegaRad[point]! / 2);
    const uRe = -2 * half * half;
    const uIm = 2 * half * Math.cos(omegaRad[point]! / 2);
    let sum = halves;
    for (let at = 0; at < flat.length; at += 3) {
      const dRe = flat[at]! + uRe;
      const dIm = flat[at + 1]! + uIm;
      sum += flat[at + 2]! / (dRe * dRe + dIm * dIm);
    }
    delay[point] = sum;
  }
}
