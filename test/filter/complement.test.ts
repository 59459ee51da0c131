import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  complementOf,
  complementOfHalfBand,
  designHalfBand,
  designLowPass,
  type Family,
  rotateFilter,
  transmissionAt,
} from '../../src/filter/index.ts';
import { roundingBound } from './designs.ts';

const asks = fc.record({
  family: fc.constantFrom<Family>('BUTTERWORTH', 'CHEBYSHEV_I', 'CHEBYSHEV_II', 'ELLIPTIC'),
  order: fc.integer({ min: 1, max: 10 }),
  edgeRad: fc.double({ min: 0.3, max: 2.6, noNaN: true }),
  rippleDb: fc.double({ min: 0.05, max: 3, noNaN: true }),
  rejectionDb: fc.double({ min: 10, max: 60, noNaN: true }),
});

describe('power complement', () => {
  it('carries at every frequency the power that the filter does not [property]', () => {
    fc.assert(
      fc.property(asks, fc.double({ min: -3, max: 3, noNaN: true }), (ask, centreRad) => {
        const filter = rotateFilter(designLowPass(ask), centreRad);
        const complement = complementOf(ask, filter, centreRad);
        for (let omega = -3; omega <= 3; omega += 0.173) {
          expect(
            Math.abs(transmissionAt(filter, omega) + transmissionAt(complement, omega) - 1),
          ).toBeLessThan(roundingBound(filter));
        }
      }),
      { numRuns: 100, seed: 71 },
    );
  });

  it('of a half-band filter is the same filter half a free spectral range on [property]', () => {
    const filter = designHalfBand({ family: 'ELLIPTIC', order: 5, stopEdgeRad: 0.62 * Math.PI });
    const complement = complementOfHalfBand(filter);
    for (let omega = -3; omega <= 3; omega += 0.1) {
      expect(
        Math.abs(transmissionAt(complement, omega) - transmissionAt(filter, omega + Math.PI)),
      ).toBeLessThan(roundingBound(filter));
    }
  });
});
