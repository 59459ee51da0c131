/** The greatest transmission of a filter over one FSR, found where d ln|H|²/dΩ falls through zero. */
import type { Complex } from 'complex.js';
import { evaluateInto } from './evaluate.ts';
import type { TransferFunction } from './transfer-function.ts';

export interface Peak {
  readonly omegaRad: number;
  /** Power transmission, linear. */
  readonly transmission: number;
}

/** Uniform points of the search; peaks narrower than their spacing lie at poles and are found from those. */
const UNIFORM_POINTS = 64;

/** Distances from a pole's angle, in units of its distance to the unit circle, at which a slope is taken too. */
const REACHES = [0, 0.3, 1, 3, 10] as const;

/**
 * Halvings of a bracket. Brackets next to a pole are as narrow as the pole's distance to the unit circle, and the
 * transmission is level at its peak: 2⁻²⁸ of a bracket moves it by 2⁻⁵⁶.
 */
const BISECTIONS = 28;

/** ½·d|e^{jΩ} − root|²/dΩ over |e^{jΩ} − root|². */
function slopeOf(root: Complex, cos: number, sin: number): number {
  const dRe = cos - root.re;
  const dIm = sin - root.im;
  return (root.re * sin - root.im * cos) / (dRe * dRe + dIm * dIm);
}

/** d ln|H|/dΩ. On a null, where it has no value, NaN or an infinity. */
function slope(filter: TransferFunction, omegaRad: number): number {
  const cos = Math.cos(omegaRad);
  const sin = Math.sin(omegaRad);
  let sum = 0;
  for (const zero of filter.zeros) sum += slopeOf(zero, cos, sin);
  for (const pole of filter.poles) sum -= slopeOf(pole, cos, sin);
  return sum;
}

function searchPoints(filter: TransferFunction): number[] {
  const points = Array.from(
    { length: UNIFORM_POINTS },
    (_, index) => (2 * Math.PI * index) / UNIFORM_POINTS - Math.PI,
  );
  for (const pole of filter.poles) {
    const angle = pole.arg();
    const distance = 1 - pole.abs();
    for (const reach of REACHES) points.push(angle - reach * distance, angle + reach * distance);
  }
  points.sort((a, b) => a - b);
  return points;
}

function climbBetween(filter: TransferFunction, left: number, right: number): number {
  let low = left;
  let high = right;
  for (let step = 0; step < BISECTIONS; step++) {
    const middle = 0.5 * (low + high);
    if (slope(filter, middle) > 0) low = middle;
    else high = middle;
  }
  return 0.5 * (low + high);
}

/** Every search point, and between each two with a maximum between them that maximum. */
function candidates(filter: TransferFunction): Float64Array {
  const points = searchPoints(filter);
  points.push(points[0]! + 2 * Math.PI);
  const found = [...points];
  let rising = slope(filter, points[0]!) > 0;
  for (let index = 1; index < points.length; index++) {
    const risingNext = slope(filter, points[index]!) > 0;
    if (rising && !risingNext) found.push(climbBetween(filter, points[index - 1]!, points[index]!));
    rising = risingNext;
  }
  return Float64Array.from(found);
}

/**
 * Greatest transmission over the FSR and where. For stable filters (|poles| < 1) with zeros anywhere. Relative error
 * of the transmission about that of `evaluateInto`, since the slope vanishes there. O(order² · 100).
 */
export function findPeak(filter: TransferFunction): Peak {
  const omegaRad = candidates(filter);
  const re = new Float64Array(omegaRad.length);
  const im = new Float64Array(omegaRad.length);
  evaluateInto(filter, omegaRad, re, im);
  let best: Peak = { omegaRad: omegaRad[0]!, transmission: -1 };
  for (let point = 0; point < omegaRad.length; point++) {
    const transmission = re[point]! * re[point]! + im[point]! * im[point]!;
    if (transmission > best.transmission) best = { omegaRad: omegaRad[point]!, transmission };
  }
  return best;
}
