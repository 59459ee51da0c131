import { Complex } from 'complex.js';
import { describe, expect, it } from 'vitest';
import {
  completeIntegral,
  inverseSnImaginary,
  jacobiCd,
  jacobiSn,
  landenSequence,
  logNome,
  modulusOfLogNome,
} from '../../src/filter/elliptic.ts';
import { type Pair, readReference } from './reference.ts';

/** A few roundings: closed forms and recursions of at most ten steps. */
const ROUNDING = 2e-15;

/** Near k = 1 the argument u·K itself, rounded once, moves cd and sn by K·ε times their slope. */
const FUNCTION_ERROR = 5e-14;

interface FunctionEntry {
  k: number;
  complement: number;
  K: number;
  logNome: number;
  u: Pair;
  cd: Pair;
  sn: Pair;
}

const table = readReference<{ values: FunctionEntry[] }>('elliptic-functions').values;

/** J. M. Borwein and P. B. Borwein, "Pi and the AGM", Wiley 1987, singular values of §4.6 (from memory): K'/K = √r. */
const singular = [
  { r: 1, k: Math.SQRT1_2 },
  { r: 2, k: Math.SQRT2 - 1 },
  { r: 3, k: (Math.sqrt(6) - Math.SQRT2) / 4 },
  { r: 4, k: 3 - 2 * Math.SQRT2 },
];

describe('elliptic functions', () => {
  it('K at k² = ½ is Γ(¼)²/(4√π) [published]', () => {
    // NIST Digital Library of Mathematical Functions 19.20.2: R_F(0, 1, 2) = 1.31102 87771 46059 90…, K = √2·R_F
    const K = completeIntegral({ k: Math.SQRT1_2, complement: Math.SQRT1_2 });
    expect(Math.abs(K - Math.SQRT2 * 1.31102877714606)).toBeLessThan(ROUNDING);
  });

  it.each(singular)(
    "the singular modulus of K'/K = √$r is found from its nome and back [published]",
    ({ r, k }) => {
      const logQ = -Math.PI * Math.sqrt(r);
      const found = modulusOfLogNome(logQ);
      expect(Math.abs(found.k / k - 1)).toBeLessThan(ROUNDING);
      expect(Math.abs(Math.hypot(found.k, found.complement) - 1)).toBeLessThan(ROUNDING);
      expect(Math.abs(logNome(found) / logQ - 1)).toBeLessThan(ROUNDING);
    },
  );

  it("complete integrals, nomes, cd and sn agree with mpmath from k = 0.1 to k' = 1e-8 [cross-check]", () => {
    expect(table.length).toBe(36);
    for (const entry of table) {
      const modulus = { k: entry.k, complement: entry.complement };
      expect(Math.abs(completeIntegral(modulus) / entry.K - 1)).toBeLessThan(ROUNDING);
      expect(Math.abs(logNome(modulus) / entry.logNome - 1)).toBeLessThan(ROUNDING);
      const sequence = landenSequence(modulus);
      const u = new Complex(entry.u[0], entry.u[1]);
      const cd = jacobiCd(u, sequence).sub(new Complex(entry.cd[0], entry.cd[1]));
      const sn = jacobiSn(u, sequence).sub(new Complex(entry.sn[0], entry.sn[1]));
      expect(cd.abs()).toBeLessThan(FUNCTION_ERROR * Math.max(1, Math.hypot(...entry.cd)));
      expect(sn.abs()).toBeLessThan(FUNCTION_ERROR * Math.max(1, Math.hypot(...entry.sn)));
    }
  });

  it('the inverse of sn on the imaginary axis undoes sn [property]', () => {
    for (const k of [1e-6, 0.3, 0.99]) {
      const modulus = { k, complement: Math.sqrt((1 - k) * (1 + k)) };
      for (const y of [1e-3, 1, 40]) {
        const v = inverseSnImaginary(y, modulus);
        const back = jacobiSn(new Complex(0, v), landenSequence(modulus));
        expect(Math.abs(back.im / y - 1)).toBeLessThan(1e-12);
        expect(Math.abs(back.re)).toBeLessThan(1e-12 * y);
      }
    }
  });
});
