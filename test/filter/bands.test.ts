import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { Refusal } from '../../src/errors.ts';
import {
  type BandAsk,
  designHighPass,
  designLowPass,
  designMirroredBandPass,
  evaluateInto,
  findPeak,
  rotateFilter,
  transmissionAt,
} from '../../src/filter/index.ts';
import { anyLowPass, fieldOf, roundingBound } from './designs.ts';
import { type DesignEntry, designOf, type Pair, readReference, rootDistance } from './reference.ts';

interface DigitalEntry extends DesignEntry {
  zeros: Pair[];
  poles: Pair[];
  gain: number;
  w: number[];
  H: Pair[];
}

const designs = readReference<{ designs: DigitalEntry[] }>('digital-designs').designs;

/** Position of a root in the z plane: rounding. */
const ROOT = 5e-15;

/** Relative error of the gain: one rounding or two a factor, and the s-plane zeros' own error. */
const GAIN = 2e-14;

/** Field error of well-conditioned designs; the aim is 1e-9. */
const FIELD = 1e-12;

describe('digital designs', () => {
  it('covers all 54 reference designs', () => {
    expect(designs.length).toBe(54);
  });

  it.each(designs)('$id: zeros, poles and gain [cross-check]', (entry) => {
    const filter = designOf(entry);
    expect(rootDistance(filter.poles, entry.poles)).toBeLessThan(ROOT);
    expect(rootDistance(filter.zeros, entry.zeros)).toBeLessThan(ROOT);
    expect(filter.gain.im).toBe(0);
    expect(Math.abs(filter.gain.re / entry.gain - 1)).toBeLessThan(GAIN);
    expect(filter.arms.length).toBe(filter.poles.length);
  });

  it.each(designs)('$id: complex response [cross-check]', (entry) => {
    const filter = designOf(entry);
    const field = fieldOf(
      filter,
      entry.w.map((w) => w * Math.PI),
    );
    entry.H.forEach(([re, im], point) => {
      expect(Math.hypot(field[point]!.re - re, field[point]!.im - im)).toBeLessThan(FIELD);
    });
  });

  it('the everyday second-order Chebyshev II: 10 dB beyond 0.5π (common practice, no source) [property]', () => {
    const filter = designLowPass({ family: 'CHEBYSHEV_II', order: 2, rejectionDb: 10, edgeRad: Math.PI / 2 });
    expect(10 * Math.log10(transmissionAt(filter, Math.PI / 2))).toBeCloseTo(-10, 10);
    expect(10 * Math.log10(transmissionAt(filter, Math.PI))).toBeCloseTo(-10, 10);
    expect(transmissionAt(filter, 0)).toBeCloseTo(1, 13);
  });
});

describe('edges', () => {
  const cases: [BandAsk, number][] = [
    [{ family: 'BUTTERWORTH', order: 6, edgeRad: 0.7 }, 10 * Math.log10(2)],
    [{ family: 'CHEBYSHEV_I', order: 6, edgeRad: 0.7, rippleDb: 0.3 }, 0.3],
    [{ family: 'CHEBYSHEV_II', order: 6, edgeRad: 0.7, rejectionDb: 35 }, 35],
    [{ family: 'ELLIPTIC', order: 6, edgeRad: 0.7, rippleDb: 0.3, rejectionDb: 35 }, 0.3],
  ];
  it.each(cases)(
    '%o attenuates by what its family means by an edge, low- and high-pass [published]',
    (ask, demand) => {
      // design edges as in Parks and Burrus 1987, chapter 7
      expect(-10 * Math.log10(transmissionAt(designLowPass(ask), 0.7))).toBeCloseTo(demand, 10);
      const mirrored = designHighPass({ ...ask, edgeRad: Math.PI - 0.7 });
      expect(-10 * Math.log10(transmissionAt(mirrored, Math.PI - 0.7))).toBeCloseTo(demand, 10);
    },
  );
});

describe('any design', () => {
  it('has a peak transmission of 1 and no more [property]', () => {
    fc.assert(
      fc.property(anyLowPass(), (ask) => {
        for (const filter of [designLowPass(ask), designHighPass(ask)]) {
          expect(Math.abs(findPeak(filter).transmission - 1)).toBeLessThan(2 * roundingBound(filter));
        }
      }),
      { numRuns: 150, seed: 11 },
    );
  });

  it('repeats every free spectral range [property]', () => {
    const turn = 2 * Math.PI;
    fc.assert(
      fc.property(anyLowPass(), fc.double({ min: -3, max: 3, noNaN: true }), (ask, omegaRad) => {
        const filter = designLowPass(ask);
        const [here, there] = fieldOf(filter, [omegaRad, omegaRad + turn]) as [Pairs, Pairs];
        expect(Math.hypot(here.re - there.re, here.im - there.im)).toBeLessThan(roundingBound(filter));
      }),
      { numRuns: 150, seed: 12 },
    );
  });

  it('rotated by a centre answers at Ω as it did at Ω − centre, in magnitude and phase [property]', () => {
    const angle = fc.double({ min: -3, max: 3, noNaN: true });
    fc.assert(
      fc.property(anyLowPass(), angle, angle, (ask, centreRad, omegaRad) => {
        const filter = designLowPass(ask);
        const rotated = rotateFilter(filter, centreRad);
        const [here] = fieldOf(rotated, [omegaRad]) as [Pairs];
        const [there] = fieldOf(filter, [omegaRad - centreRad]) as [Pairs];
        expect(Math.hypot(here.re - there.re, here.im - there.im)).toBeLessThan(roundingBound(filter));
        expect(rotated.arms).toEqual(filter.arms);
      }),
      { numRuns: 150, seed: 13 },
    );
  });

  it('as a high-pass is the low-pass of the mirrored edge, half a free spectral range on [property]', () => {
    fc.assert(
      fc.property(anyLowPass(), fc.double({ min: -3, max: 3, noNaN: true }), (ask, omegaRad) => {
        const high = designHighPass({ ...ask, edgeRad: Math.PI - ask.edgeRad });
        const turned = rotateFilter(designLowPass(ask), Math.PI);
        const difference =
          Math.sqrt(transmissionAt(high, omegaRad)) - Math.sqrt(transmissionAt(turned, omegaRad));
        expect(Math.abs(difference)).toBeLessThan(2 * roundingBound(high));
      }),
      { numRuns: 150, seed: 14 },
    );
  });
});

type Pairs = { re: number; im: number };

describe('what is refused', () => {
  const good: BandAsk = { family: 'ELLIPTIC', order: 4, edgeRad: 1, rippleDb: 1, rejectionDb: 40 };
  const wrong: [string, BandAsk][] = [
    ['order 0', { ...good, order: 0 }],
    ['order 1000', { ...good, order: 1000 }],
    ['order 2.5', { ...good, order: 2.5 }],
    ['order NaN', { ...good, order: Number.NaN }],
    ['an edge at the centre', { ...good, edgeRad: 0 }],
    ['an edge at half the FSR', { ...good, edgeRad: Math.PI }],
    ['an edge that is not a number', { ...good, edgeRad: Number.NaN }],
    ['no ripple', { ...good, rippleDb: 0 }],
    ['a negative ripple', { ...good, rippleDb: -1 }],
    ['a ripple that is not a number', { ...good, rippleDb: Number.NaN }],
    ['an infinite rejection', { ...good, rejectionDb: Number.POSITIVE_INFINITY }],
    ['a ripple beyond the rejection', { ...good, rippleDb: 50 }],
    ['a Chebyshev II without its rejection', { family: 'CHEBYSHEV_II', order: 4, edgeRad: 1 }],
    ['a Chebyshev I without its ripple', { family: 'CHEBYSHEV_I', order: 4, edgeRad: 1 }],
    ['poles lost in the unit circle', { ...good, order: 16, rippleDb: 3, rejectionDb: 3.5 }],
  ];
  it.each(wrong)('%s [property]', (_, ask) => {
    expect(() => designLowPass(ask)).toThrow(Refusal);
    expect(() => designHighPass(ask)).toThrow(Refusal);
  });

  it('a mirrored band whose edges are crossed [property]', () => {
    const { edgeRad: _, ...ask } = good;
    expect(() => designMirroredBandPass({ ...ask, lowEdgeRad: 1, highEdgeRad: 1 })).toThrow(Refusal);
  });

  it('leaves nothing unwritten in the buffers of an evaluation [property]', () => {
    const omegaRad = Float64Array.from({ length: 5 }, (_, index) => index);
    const re = new Float64Array(5).fill(Number.NaN);
    const im = new Float64Array(5).fill(Number.NaN);
    evaluateInto(designLowPass(good), omegaRad, re, im);
    expect([...re, ...im].every(Number.isFinite)).toBe(true);
  });
});
