/** The greatest value of a smooth function on the unit circle that turns fastest near known poles. */
import type { Complex } from 'complex.js';

const UNIFORM_POINTS = 128;
const POINTS_PER_POLE = 24;

/** Golden-section steps: 0.618⁴⁴ of a bracket is 6e-10 of it, where a smooth peak is flat to rounding. */
const REFINING_STEPS = 44;
const GOLDEN = (Math.sqrt(5) - 1) / 2;

/** Ascending Ω over one FSR, dense around every pole in steps of its distance from the circle. */
export function circleGrid(poles: readonly Complex[], uniformPoints: number): Float64Array {
  const grid: number[] = [];
  for (let k = 0; k < uniformPoints; k++) grid.push(-Math.PI + (2 * Math.PI * k) / uniformPoints);
  for (const pole of poles) {
    const angle = pole.arg();
    const width = Math.max(1 - pole.abs(), Number.EPSILON);
    for (let k = 0; k <= POINTS_PER_POLE; k++) {
      const omega = angle + (width * (k - POINTS_PER_POLE / 2)) / 4;
      grid.push(omega - 2 * Math.PI * Math.round(omega / (2 * Math.PI)));
    }
  }
  return Float64Array.from(grid).sort();
}

/** Where f is greatest: the best of a grid, refined by golden section (J. Kiefer, Proc. AMS 4, 502 (1953)). */
export function greatestOnCircle(
  poles: readonly Complex[],
  f: (omegaRad: number) => number,
): { omegaRad: number; value: number } {
  const grid = circleGrid(poles, UNIFORM_POINTS);
  let best = 0;
  let value = Number.NEGATIVE_INFINITY;
  grid.forEach((omega, k) => {
    const here = f(omega);
    if (here > value) {
      value = here;
      best = k;
    }
  });
  const last = grid.length - 1;
  let low = best > 0 ? grid[best - 1]! : grid[last]! - 2 * Math.PI;
  let high = best < last ? grid[best + 1]! : grid[0]! + 2 * Math.PI;
  let omegaRad = grid[best]!;
  for (let step = 0; step < REFINING_STEPS; step++) {
    const left = high - GOLDEN * (high - low);
    const right = low + GOLDEN * (high - low);
    const fLeft = f(left);
    const fRight = f(right);
    if (fLeft > value) [omegaRad, value] = [left, fLeft];
    if (fRight > value) [omegaRad, value] = [right, fRight];
    if (fLeft > fRight) high = right;
    else low = left;
  }
  return { omegaRad, value };
}
