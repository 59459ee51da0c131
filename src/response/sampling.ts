/** Sampling grids that miss nothing: even spacing for the slow part, clusters around every pole. */
import type { FieldSource } from './source.ts';

/** Even samples an FSR for each turn the field can make, and for the interferometer itself. */
const SAMPLES_PER_TURN = 64;
const LEAST_SAMPLES = 512;
/** Beyond this the poles' own clusters carry the resolution. */
const MOST_SAMPLES = 8192;

/** Distances from a pole in its half-widths, each about 1.4 times the one before. */
const FIRST_STEP = 0.15;
const STEP_RATIO = 1.4;
/** FIRST_STEP·1.4⁴⁸ ≈ 1.5e6 half-widths: from a pole of K = 1e-7 to where the even grid is finer. */
const MOST_STEPS = 48;

function addCluster(
  points: number[],
  centre: number,
  halfWidth: number,
  reach: number,
  low: number,
  high: number,
) {
  const add = (x: number) => {
    if (x > low && x < high) points.push(x);
  };
  add(centre);
  let step = FIRST_STEP * halfWidth;
  for (let k = 0; k < MOST_STEPS && step > 0 && step < reach; k++) {
    add(centre - step);
    add(centre + step);
    step *= STEP_RATIO;
  }
}

/** Ascending offsets from `lowGhz` to `highGhz`, both included, no two equal. One point when the interval is a line. */
export function sampleOffsets(source: FieldSource, lowGhz: number, highGhz: number): Float64Array {
  const span = highGhz - lowGhz;
  if (!(span > 0)) return Float64Array.of(lowGhz);
  const perFsr = Math.min(MOST_SAMPLES, Math.max(LEAST_SAMPLES, SAMPLES_PER_TURN * (source.turns + 1)));
  const even = Math.max(16, Math.ceil((perFsr * span) / source.fsrGhz));
  const points = [lowGhz, highGhz];
  for (let i = 1; i < even; i++) points.push(lowGhz + (span * i) / even);
  // a cluster reaches until its own spacing equals the even one
  const reach = source.fsrGhz / perFsr / (1 - 1 / STEP_RATIO);
  for (const { offsetGhz, halfWidthGhz, spacingGhz } of source.features) {
    const first = Math.ceil((lowGhz - reach - offsetGhz) / spacingGhz);
    const last = Math.floor((highGhz + reach - offsetGhz) / spacingGhz);
    for (let k = first; k <= last; k++)
      addCluster(points, offsetGhz + k * spacingGhz, halfWidthGhz, reach, lowGhz, highGhz);
  }
  const sorted = Float64Array.from(points).sort();
  return sorted.filter((x, i) => i === 0 || x > sorted[i - 1]!);
}
