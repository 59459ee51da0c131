/** Random low-pass questions, and fields as objects. */
import fc from 'fast-check';
import { type BandAsk, evaluateInto, type Family, type TransferFunction } from '../../src/filter/index.ts';

export function fieldOf(filter: TransferFunction, omegaRad: readonly number[]): { re: number; im: number }[] {
  const grid = Float64Array.from(omegaRad);
  const re = new Float64Array(grid.length);
  const im = new Float64Array(grid.length);
  evaluateInto(filter, grid, re, im);
  return omegaRad.map((_, point) => ({ re: re[point]!, im: im[point]! }));
}

/**
 * What rounding the poles of a filter to doubles may do to its field: each moves by some ε, and the response turns
 * around it over its distance to the unit circle. The floor covers the roundings of the product itself.
 */
export function roundingBound(filter: TransferFunction): number {
  const distances = filter.poles.map((pole) => 1 - pole.abs());
  return 1e-12 + (4 * Number.EPSILON * filter.poles.length) / Math.min(...distances);
}

/** Any family to order 16, ripple 1e-6 … 3 dB, rejection 20 … 100 dB, edge 0.02π … 0.98π. */
export function anyLowPass(maxOrder = 16): fc.Arbitrary<Required<BandAsk>> {
  return fc.record({
    family: fc.constantFrom<Family>('BUTTERWORTH', 'CHEBYSHEV_I', 'CHEBYSHEV_II', 'ELLIPTIC'),
    order: fc.integer({ min: 1, max: maxOrder }),
    rippleDb: fc.double({ min: -6, max: Math.log10(3), noNaN: true }).map((exponent) => 10 ** exponent),
    rejectionDb: fc.double({ min: 20, max: 100, noNaN: true }),
    edgeRad: fc.double({ min: 0.02 * Math.PI, max: 0.98 * Math.PI, noNaN: true }),
  });
}
