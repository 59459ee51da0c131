import { Complex } from 'complex.js';
import { describe, expect, it } from 'vitest';
import { designLowPass } from '../../src/filter/index.ts';
import { designOf, readReference } from './reference.ts';

interface PolynomialEntry {
  id: string;
  spec: [string, number, string | string[], string, (string | null)?, (string | null)?];
  b: number[];
  a: number[];
  printedB: number[];
  printedA: number[];
  tolerance: number;
}

const { polynomials, secondOrderHalfBand } = readReference<{
  polynomials: PolynomialEntry[];
  secondOrderHalfBand: { b: number[]; a: number[] };
}>('textbooks');

/** Coefficients of gain·Π(1 − root·z⁻¹), ascending powers of z⁻¹. For comparison with printed polynomials only. */
function expand(roots: readonly Complex[], gain: number): number[] {
  let coefficients = [new Complex(gain, 0)];
  for (const root of roots) {
    const next = [...coefficients, new Complex(0, 0)];
    coefficients.forEach((value, power) => {
      next[power + 1] = next[power + 1]!.sub(value.mul(root));
    });
    coefficients = next;
  }
  return coefficients.map((value) => value.re);
}

/** Greatest difference over the greatest coefficient. */
function difference(found: readonly number[], expected: readonly number[]): number {
  const greatest = Math.max(...expected.map(Math.abs));
  return Math.max(...expected.map((value, power) => Math.abs(found[power]! - value))) / greatest;
}

/** Expanding to 20 factors multiplies roundings; it is why the project does not use polynomials. */
const EXPANSION = 1e-12;

describe('printed designs', () => {
  it.each(polynomials)('$id: numerator and denominator, exact and as printed [cross-check]', (entry) => {
    const [family, order, edges, band, ripple, rejection] = entry.spec;
    const filter = designOf({
      id: entry.id,
      family,
      order,
      band,
      edges: [edges].flat().map(Number),
      rippleDb: ripple == null ? null : Number(ripple),
      rejectionDb: rejection == null ? null : Number(rejection),
    });
    const b = expand(filter.zeros, filter.gain.re);
    const a = expand(filter.poles, 1);
    expect(b.length).toBe(entry.b.length);
    expect(difference(b, entry.b)).toBeLessThan(EXPANSION);
    expect(difference(a, entry.a)).toBeLessThan(EXPANSION);
    expect(difference(b, entry.printedB)).toBeLessThan(Math.max(entry.tolerance, EXPANSION));
    expect(difference(a, entry.printedA)).toBeLessThan(Math.max(entry.tolerance, EXPANSION));
  });

  it('the second-order Butterworth at a quarter of the sampling rate [published]', () => {
    // Ziemer, Tranter and Fannin, Signals and Systems, 4th ed. 1998, Example 9-7
    const filter = designLowPass({ family: 'BUTTERWORTH', order: 2, edgeRad: Math.PI / 2 });
    const b = expand(filter.zeros, filter.gain.re);
    const a = expand(filter.poles, 1);
    secondOrderHalfBand.b.forEach((value, power) => {
      expect(Math.abs(b[power]! - value)).toBeLessThan(1e-14);
      expect(Math.abs(a[power]! - secondOrderHalfBand.a[power]!)).toBeLessThan(1e-14);
    });
  });
});
