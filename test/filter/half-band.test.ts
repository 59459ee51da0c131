import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { Refusal } from '../../src/errors.ts';
import {
  decompose,
  designHalfBand,
  findPeak,
  type HalfBandFamily,
  halfBandIsolationDb,
  halfBandStopEdgeRad,
  leastHalfBandOrder,
  transmissionAt,
} from '../../src/filter/index.ts';
import { roundingBound } from './designs.ts';
import { readReference } from './reference.ts';

interface HalfBandSet {
  order: number;
  edgeOffset: number;
  a: number[];
  b: number[];
  tolerance: number;
  stopbandDb: number;
  exact: number[];
  samplesDb: [number, number][];
}

const reference = readReference<{
  sets: HalfBandSet[];
  butterworth: { doubleLengthRing: Record<string, number | number[]> };
}>('half-bands');

const families = fc.constantFrom<HalfBandFamily>('BUTTERWORTH', 'ELLIPTIC');
const oddOrders = fc.integer({ min: 1, max: 7 }).map((half) => 2 * half + 1);
const isolations = fc.double({ min: 15, max: 90, noNaN: true });

/** Squared imaginary parts of the upper poles: the coefficients of (a + z⁻²)/(1 + a·z⁻²), ascending. */
const coefficientsOf = (poles: readonly { re: number; im: number }[]): number[] =>
  poles
    .filter((pole) => pole.im > 0)
    .map((pole) => pole.im ** 2)
    .sort((left, right) => left - right);

describe('half-band filters', () => {
  it.each(reference.sets)(
    'order $order: the all-pass coefficients of published tables [published]',
    (set) => {
      // edges of the printed tables are given to about 1e-12, hence their tolerance; `exact` is the 60-digit design
      const stopEdgeRad = (0.5 + set.edgeOffset) * Math.PI;
      const filter = designHalfBand({ family: 'ELLIPTIC', order: set.order, stopEdgeRad });
      const found = coefficientsOf(filter.poles);
      const printed = [...set.a, ...set.b].sort((left, right) => left - right);
      found.forEach((value, index) => {
        expect(Math.abs(value - printed[index]!)).toBeLessThan(set.tolerance);
        expect(Math.abs(value - set.exact[index]!)).toBeLessThan(1e-12);
      });
      expect(found.length).toBe(printed.length);
      expect(halfBandIsolationDb('ELLIPTIC', set.order, stopEdgeRad)).toBeCloseTo(set.stopbandDb, 9);
      // the samples follow the printed digits of the coefficients
      for (const [w, db] of set.samplesDb) {
        const field = Math.sqrt(transmissionAt(filter, w * Math.PI));
        expect(Math.abs(field - 10 ** (db / 20))).toBeLessThan(set.tolerance);
      }
    },
  );

  it('the arms of the published tables are the alternate poles [published]', () => {
    for (const set of reference.sets) {
      const stopEdgeRad = (0.5 + set.edgeOffset) * Math.PI;
      const pair = decompose(designHalfBand({ family: 'ELLIPTIC', order: set.order, stopEdgeRad }));
      const arms = pair.arms.map(coefficientsOf).sort((left, right) => left[0]! - right[0]!);
      for (const [arm, printed] of [set.a, set.b].entries()) {
        printed.forEach((value, index) => {
          expect(Math.abs(arms[arm]![index]! - value)).toBeLessThan(set.tolerance);
        });
      }
      expect(pair.residual).toBeLessThan(1e-12);
    }
  });

  it.each([3, 5, 7])('Butterworth of order %i has poles ±j·tan(kπ/2N) [published]', (order) => {
    // Gazsi 1985; Vaidyanathan 1993, chapter 5
    const found = coefficientsOf(designHalfBand({ family: 'BUTTERWORTH', order }).poles);
    const expected = [reference.butterworth.doubleLengthRing[`N${order}`]!].flat();
    expect(found.length).toBe(expected.length);
    expected.forEach((value, index) => {
      expect(Math.abs(found[index]! - value)).toBeLessThan(1e-15);
    });
  });

  it('has every pole on the imaginary axis, one of them at 0, exactly [property]', () => {
    fc.assert(
      fc.property(families, oddOrders, isolations, (family, order, isolationDb) => {
        const { poles } = designHalfBand({ family, order, isolationDb });
        expect(poles.every((pole) => Math.abs(pole.re) === 0)).toBe(true);
        expect(poles.filter((pole) => pole.abs() === 0).length).toBe(1);
        expect(Math.abs(poles[(order - 1) / 2]!.im)).toBe(0);
      }),
      { numRuns: 100, seed: 41 },
    );
  });

  it('is power symmetric: both outputs are one channel filter half an FSR apart [property]', () => {
    const angles = fc.double({ min: 0, max: Math.PI, noNaN: true });
    fc.assert(
      fc.property(families, oddOrders, isolations, angles, (family, order, isolationDb, omegaRad) => {
        const filter = designHalfBand({ family, order, isolationDb });
        const sum = transmissionAt(filter, omegaRad) + transmissionAt(filter, Math.PI - omegaRad);
        expect(Math.abs(sum - 1)).toBeLessThan(10 * roundingBound(filter));
        expect(Math.abs(findPeak(filter).transmission - 1)).toBeLessThan(10 * roundingBound(filter));
      }),
      { numRuns: 200, seed: 42 },
    );
  });

  it('isolates by what was asked from its stop edge on, with the ripple that this fixes [property]', () => {
    fc.assert(
      fc.property(families, oddOrders, isolations, (family, order, isolationDb) => {
        const stopEdgeRad = halfBandStopEdgeRad(family, order, isolationDb);
        const filter = designHalfBand({ family, order, isolationDb });
        const isolation = -10 * Math.log10(transmissionAt(filter, stopEdgeRad));
        const ripple = -10 * Math.log10(transmissionAt(filter, Math.PI - stopEdgeRad));
        expect(Math.abs(isolation - isolationDb)).toBeLessThan(1e-6);
        expect(Math.abs(ripple + 10 * Math.log10(1 - 10 ** (-isolationDb / 10)))).toBeLessThan(1e-9);
        expect(Math.abs(halfBandIsolationDb(family, order, stopEdgeRad) - isolationDb)).toBeLessThan(1e-6);
        expect(leastHalfBandOrder(family, { isolationDb, stopEdgeRad })).toBeLessThanOrEqual(order);
      }),
      { numRuns: 200, seed: 43 },
    );
  });

  it('the least order isolates enough, two less does not [property]', () => {
    const edges = fc.double({ min: 1.75, max: 2.6, noNaN: true });
    fc.assert(
      fc.property(
        fc.constant<HalfBandFamily>('ELLIPTIC'),
        edges,
        isolations,
        (family, stopEdgeRad, isolationDb) => {
          const order = leastHalfBandOrder(family, { isolationDb, stopEdgeRad });
          expect(order % 2).toBe(1);
          expect(halfBandIsolationDb(family, order, stopEdgeRad)).toBeGreaterThan(isolationDb - 1e-6);
          if (order < 3) return;
          expect(halfBandIsolationDb(family, order - 2, stopEdgeRad)).toBeLessThan(isolationDb + 1e-6);
        },
      ),
      { numRuns: 200, seed: 44 },
    );
  });

  it('refuses even orders, too little isolation, edges inside the passband, both or neither figure [property]', () => {
    const wrong = [
      { family: 'ELLIPTIC', order: 4, isolationDb: 40 },
      { family: 'BUTTERWORTH', order: 2 },
      { family: 'ELLIPTIC', order: 5, isolationDb: 3 },
      { family: 'ELLIPTIC', order: 5, stopEdgeRad: 1.5 },
      { family: 'ELLIPTIC', order: 5, stopEdgeRad: 2, isolationDb: 30 },
      { family: 'ELLIPTIC', order: 5 },
      { family: 'ELLIPTIC', order: 5, isolationDb: Number.NaN },
    ] as const;
    for (const ask of wrong) expect(() => designHalfBand(ask)).toThrow(Refusal);
  });

  it('says which odd orders are nearest to an even one [property]', () => {
    try {
      designHalfBand({ family: 'BUTTERWORTH', order: 4 });
      expect.unreachable();
    } catch (error) {
      expect(error).toBeInstanceOf(Refusal);
      expect((error as Refusal).details.allowed).toEqual({ nearest: [3, 5] });
    }
  });
});
