import { Complex } from 'complex.js';
import { describe, expect, it } from 'vitest';
import { analogPrototype, type Family, type PrototypeAsk } from '../../src/filter/index.ts';
import { askOf, type Pair, readReference, rootDistance } from './reference.ts';

interface PrototypeEntry {
  id: string;
  source: string;
  family: Family;
  order: number;
  rippleDb: number | null;
  rejectionDb: number | null;
  zeros: Pair[];
  poles: Pair[];
  gain: number | null;
}

interface References {
  tables: PrototypeEntry[];
  polynomials: {
    id: string;
    family: Family;
    rippleDb: number | null;
    tolerance: number;
    ascending: Record<string, number[]>;
  }[];
  high: (PrototypeEntry & { printed: { poles: Pair[]; k: number | null; tolerance: number } })[];
  hard: (PrototypeEntry & { k: number; complement: number; stopEdgeExcess: number })[];
}

const references = readReference<References>('analog-prototypes');

/** Closed forms and short recursions in double precision, relative to the size of the root. */
const EXACT = 2e-14;

/** Order 12 to 20, ripple to 1e-6 dB, selectivity to 1: some hundred roundings, absolute at |s| near 1. */
const HARD = 5e-14;

/** Coefficients of Π(s − p), ascending; small orders only, for comparison with printed polynomials. */
function expand(roots: readonly Complex[]): number[] {
  let coefficients = [new Complex(1, 0)];
  for (const root of roots) {
    const next = [...coefficients.map((value) => value.mul(root.neg())), new Complex(0, 0)];
    coefficients.forEach((value, power) => {
      next[power + 1] = next[power + 1]!.add(value);
    });
    coefficients = next;
  }
  return coefficients.map((value) => value.re);
}

const sizeOf = (roots: readonly Pair[]): number =>
  Math.max(1, ...roots.map(([re, im]) => Math.hypot(re, im)));

/** Angle of an s-plane pole in (0, 2π), from the positive real axis. */
const angleOf = (pole: Complex): number => (pole.arg() + 2 * Math.PI) % (2 * Math.PI);

describe('analog prototypes', () => {
  it.each(references.tables)('$id: zeros, poles and gain as tabulated [cross-check]', (entry) => {
    const prototype = analogPrototype(askOf(entry));
    expect(rootDistance(prototype.poles, entry.poles)).toBeLessThan(EXACT * sizeOf(entry.poles));
    expect(rootDistance(prototype.zeros, entry.zeros)).toBeLessThan(EXACT * sizeOf(entry.zeros));
    if (entry.gain !== null) expect(Math.abs(prototype.gain / entry.gain - 1)).toBeLessThan(10 * EXACT);
  });

  it.each(references.polynomials)(
    '$id: the handbook denominators, to their printed digits [published]',
    (entry) => {
      for (const [order, printed] of Object.entries(entry.ascending)) {
        const prototype = analogPrototype(askOf({ ...entry, order: Number(order), rejectionDb: null }));
        const found = expand(prototype.poles);
        printed.forEach((value, power) => {
          expect(Math.abs(found[power]! - value)).toBeLessThan(entry.tolerance);
        });
      }
    },
  );

  it.each(references.high)('$id: order $order, exact and as printed [cross-check]', (entry) => {
    const prototype = analogPrototype(askOf(entry));
    expect(rootDistance(prototype.poles, entry.poles)).toBeLessThan(HARD * sizeOf(entry.poles));
    expect(rootDistance(prototype.zeros, entry.zeros)).toBeLessThan(HARD * sizeOf(entry.zeros));
    expect(rootDistance(prototype.poles, entry.printed.poles)).toBeLessThan(
      entry.printed.tolerance * sizeOf(entry.poles),
    );
  });

  it.each(references.hard)('$id: poles and zeros to the last digits [cross-check]', (entry) => {
    const prototype = analogPrototype(askOf(entry));
    expect(rootDistance(prototype.poles, entry.poles)).toBeLessThan(HARD * sizeOf(entry.poles));
    expect(rootDistance(prototype.zeros, entry.zeros)).toBeLessThan(HARD * sizeOf(entry.zeros));
  });

  it("a fourth-order Chebyshev of 2 dB as printed in Octave's own test [cross-check]", () => {
    // Octave signal package, self-test of cheb1ap(4, 2)
    const poles: Pair[] = [
      [-0.10489, -0.95795],
      [-0.25322, -0.3968],
      [-0.25322, 0.3968],
      [-0.10489, 0.95795],
    ];
    const prototype = analogPrototype({ family: 'CHEBYSHEV_I', order: 4, rippleDb: 2 });
    expect(rootDistance(prototype.poles, poles)).toBeLessThan(7e-6);
    expect(prototype.gain).toBeCloseTo(0.1634, 4);
  });

  it('poles come by rising s-plane angle with alternating arms, the odd one real [property]', () => {
    const asks: Omit<PrototypeAsk, 'order'>[] = [
      { family: 'BUTTERWORTH' },
      { family: 'CHEBYSHEV_I', rippleDb: 1e-6 },
      { family: 'CHEBYSHEV_I', rippleDb: 3 },
      { family: 'CHEBYSHEV_II', rejectionDb: 10 },
      { family: 'CHEBYSHEV_II', rejectionDb: 120 },
      { family: 'ELLIPTIC', rippleDb: 1e-6, rejectionDb: 100 },
      { family: 'ELLIPTIC', rippleDb: 1, rejectionDb: 20 },
    ];
    for (const ask of asks) {
      for (let order = 1; order <= 16; order++) {
        const { poles, arms } = analogPrototype({ ...ask, order });
        const angles = poles.map(angleOf);
        expect(angles).toEqual(angles.toSorted((a, b) => a - b));
        expect(arms).toEqual(poles.map((_, index) => index % 2));
        for (const pole of poles) expect(pole.re).toBeLessThan(0);
        if (order % 2 === 1) expect(poles[(order - 1) / 2]!.im).toBe(0);
      }
    }
  });
});
