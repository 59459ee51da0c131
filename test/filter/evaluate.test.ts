import { Complex } from 'complex.js';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  designLowPass,
  groupDelayInto,
  rotateFilter,
  type TransferFunction,
  transmissionAt,
} from '../../src/filter/index.ts';
import { anyLowPass, fieldOf, roundingBound } from './designs.ts';
import { type DesignEntry, designOf, readReference } from './reference.ts';

interface DigitalEntry extends DesignEntry {
  w: number[];
  H: [number, number][];
  groupDelay: (number | null)[];
}

const designs = readReference<{ designs: DigitalEntry[] }>('digital-designs').designs;
const textbook = readReference<{ groupDelay: { printed: number[]; exact: number[] } }>(
  'textbooks',
).groupDelay;

/** Relative; the delay is a sum of positive terms for these designs, each with its pole's rounding. */
const DELAY = 1e-11;

function delayOf(filter: TransferFunction, omegaRad: readonly number[]): Float64Array {
  const delay = new Float64Array(omegaRad.length);
  groupDelayInto(filter, Float64Array.from(omegaRad), delay);
  return delay;
}

describe('group delay', () => {
  it.each(designs)('$id: in unit delays at every listed frequency [cross-check]', (entry) => {
    const delay = delayOf(
      designOf(entry),
      entry.w.map((w) => w * Math.PI),
    );
    let compared = 0;
    entry.groupDelay.forEach((expected, point) => {
      if (expected === null) return;
      compared++;
      expect(Math.abs(delay[point]! - expected)).toBeLessThan(DELAY * Math.max(1, Math.abs(expected)));
    });
    expect(compared).toBeGreaterThan(10);
  });

  it('a fourth-order Butterworth at 0.1 as other programs print it [published]', () => {
    // MATLAB grpdelay of butter(4, 0.1) at w = 0, π/10 … 9π/10, printed values good to 2e-6; exact in 60 digits
    const filter = designLowPass({ family: 'BUTTERWORTH', order: 4, edgeRad: 0.1 * Math.PI });
    const delay = delayOf(
      filter,
      textbook.exact.map((_, index) => (index * Math.PI) / 10),
    );
    textbook.exact.forEach((expected, index) => {
      expect(Math.abs(delay[index]! / expected - 1)).toBeLessThan(DELAY);
      expect(Math.abs(delay[index]! - textbook.printed[index]!)).toBeLessThan(2e-6);
    });
  });

  it('a plain delay delays by one, wherever its zeros would be [property]', () => {
    const one = new Complex(1, 0);
    const plain: TransferFunction = { zeros: [], poles: [new Complex(0, 0)], gain: one };
    for (const delay of delayOf(plain, [-2, 0, 0.3, 3])) expect(delay).toBeCloseTo(1, 14);
    const inner = new Complex(0.3, 0.4);
    const cancelled: TransferFunction = { zeros: [inner], poles: [inner, new Complex(0, 0)], gain: one };
    for (const delay of delayOf(cancelled, [-2, 0, 0.3, 3])) expect(delay).toBeCloseTo(1, 14);
  });

  it('is the slope of the phase [property]', () => {
    const step = 1e-5;
    fc.assert(
      fc.property(anyLowPass(8), fc.double({ min: -3, max: 3, noNaN: true }), (ask, omegaRad) => {
        const filter = rotateFilter(designLowPass(ask), 0.4);
        fc.pre(filter.poles.every((pole) => pole.abs() < 0.99) && transmissionAt(filter, omegaRad) > 1e-8);
        fc.pre(filter.zeros.every((zero) => Math.abs(Math.sin((zero.arg() - omegaRad) / 2)) > 0.01));
        const [before, after] = fieldOf(filter, [omegaRad - step, omegaRad + step]) as [Field, Field];
        const turned = new Complex(after.re, after.im).div(new Complex(before.re, before.im)).arg();
        const delay = delayOf(filter, [omegaRad])[0]!;
        // central difference: step² times the third derivative, which 1 − |p| > 0.01 keeps below 1e8
        expect(Math.abs(-turned / (2 * step) - delay)).toBeLessThan(1e-2 + 1e-4 * Math.abs(delay));
      }),
      { numRuns: 200, seed: 21 },
    );
  });
});

type Field = { re: number; im: number };

describe('response', () => {
  it('keeps its digits in dB next to a null [published]', () => {
    // Butterworth closed form |H|² = 1/(1 + (tan(Ω/2)/tan(Ω_c/2))^2N), Parks and Burrus 1987, section 7.2.1
    const filter = designLowPass({ family: 'BUTTERWORTH', order: 3, edgeRad: 1 });
    for (const offset of [1e-1, 1e-3, 1e-6, 1e-9, 1e-12]) {
      const ratio = Math.tan(0.5) * Math.tan(offset / 2);
      // π as a double is off by 1.2e-16, which is the null's own uncertainty
      const allowed = 1e-11 + 6 * (2.5e-16 / offset) * 3;
      const omegaRad = Math.PI - offset;
      expect(Math.abs(transmissionAt(filter, omegaRad) / (ratio ** 6 / (1 + ratio ** 6)) - 1)).toBeLessThan(
        allowed + 6 * (4.5e-16 / offset),
      );
    }
  });

  it('of a Chebyshev II filter follows its closed form [published]', () => {
    // |H|² = 1/(1 + ε_s²/T_N²(w_s/w)), Parks and Burrus 1987, section 7.2.3
    const order = 7;
    const edgeRad = 0.2;
    const filter = designLowPass({ family: 'CHEBYSHEV_II', order, edgeRad, rejectionDb: 50 });
    const factor = 1e5 - 1;
    for (let omegaRad = 0.011; omegaRad < Math.PI; omegaRad += 0.05) {
      const x = Math.tan(edgeRad / 2) / Math.tan(omegaRad / 2);
      const polynomial = x > 1 ? Math.cosh(order * Math.acosh(x)) : Math.cos(order * Math.acos(x));
      const expected = polynomial ** 2 / (polynomial ** 2 + factor);
      expect(Math.abs(transmissionAt(filter, omegaRad) - expected)).toBeLessThan(1e-12);
    }
  });

  it('never exceeds 1 [property]', () => {
    fc.assert(
      fc.property(anyLowPass(), fc.double({ min: -3.2, max: 3.2, noNaN: true }), (ask, omegaRad) => {
        const filter = designLowPass(ask);
        expect(transmissionAt(filter, omegaRad)).toBeLessThan(1 + 2 * roundingBound(filter));
      }),
      { numRuns: 300, seed: 22 },
    );
  });
});
