/**
 * Whole turns of heaters against certificates: every combination within bounds that no better solution can lie outside
 * of. Crosstalk, phases and floors are invented.
 */
import { describe, expect, it } from 'vitest';
import { invert } from '../../src/chip/linear.ts';
import { exchangeTurns, leastTurns, type WrapProblem, wrapProblem } from '../../src/chip/wraps.ts';
import { invent } from './invented-chips.ts';

const TURN = 2 * Math.PI;
const HEATERS = 8;
const CASES = 200;

/** mW; powers are differences of a few sums near 50 mW. */
const ROUNDING_MW = 1e-9;

/** Crosstalk between neighbours only: the inverse then has positive entries two places off the diagonal. */
function inventProblem(seed: number, crosstalk: number): { problem: WrapProblem; phases: Float64Array } {
  const random = invent(seed);
  random();
  const m = HEATERS;
  const gain = new Float64Array(m * m);
  for (let i = 0; i < m; i++) {
    const perMw = TURN / (40 + 20 * random());
    for (let j = 0; j < m; j++)
      gain[i * m + j] =
        perMw * (i === j ? 1 : Math.abs(i - j) === 1 ? crosstalk * (0.5 + 0.5 * random()) : 0);
  }
  const floorMw = Float64Array.from({ length: m }, () => 4);
  const limitMw = Float64Array.from({ length: m }, () => 150);
  const phases = Float64Array.from({ length: m }, () => TURN * (2 * random() - 1));
  return { problem: wrapProblem(gain, invert(gain, m)!.inverse, floorMw, limitMw), phases };
}

/**
 * Least total by branch and bound over the phases y = b + 2πn that powers of at least the floor and at most `best` in
 * all can have: y_i ≥ Σ_j gain_ij·floor_j, and Σ P ≥ Σ_i y_i / (largest column sum of scaled gain), which bounds n above.
 */
function certifiedLeast(problem: WrapProblem, phases: Float64Array, best: number): number {
  const m = phases.length;
  const least = phases.map((phase, i) => {
    let lift = 0;
    for (let j = 0; j < m; j++) lift += problem.gain[i * m + j]! * problem.floorMw[j]!;
    return Math.ceil((lift - phase) / TURN - 1e-9);
  });
  let heaviest = 0;
  for (let j = 0; j < m; j++) {
    let sum = 0;
    for (let i = 0; i < m; i++) sum += problem.gain[i * m + j]!;
    heaviest = Math.max(heaviest, sum);
  }
  // Σ_i y_i = Σ_j P_j·(column sum j) ≤ heaviest · Σ P: so Σ y beyond heaviest · best cannot be better.
  const budget = heaviest * best;
  const base = phases.reduce((sum, phase, i) => sum + phase + TURN * least[i]!, 0);
  let certified = best;
  const turns = Int32Array.from(least);
  const visit = (i: number, sum: number): void => {
    if (sum > budget + 1e-9) return;
    if (i === m) {
      let total = 0;
      for (let r = 0; r < m; r++) {
        let power = 0;
        for (let c = 0; c < m; c++) power += problem.inverse[r * m + c]! * (phases[c]! + TURN * turns[c]!);
        if (power < problem.floorMw[r]! - ROUNDING_MW) return;
        total += power;
      }
      certified = Math.min(certified, total);
      return;
    }
    for (let extra = 0; sum + TURN * extra <= budget + 1e-9; extra++) {
      turns[i] = least[i]! + extra;
      visit(i + 1, sum + TURN * extra);
    }
    turns[i] = least[i]!;
  };
  visit(0, base);
  return certified;
}

/** Heat over the certified least, of the least turns alone and after the exchange. */
function excesses(crosstalk: number): { readonly least: number; readonly exchanged: number }[] {
  return Array.from({ length: CASES }, (_, k) => {
    const { problem, phases } = inventProblem(1000 + k, crosstalk);
    const least = leastTurns(problem, phases);
    const found = exchangeTurns(problem, least);
    expect(found.violationMw).toBe(0);
    const certified = certifiedLeast(problem, phases, least.totalMw);
    return { least: least.totalMw / certified - 1, exchanged: found.totalMw / certified - 1 };
  });
}

const isOff = (excess: number) => excess > 1e-9;

describe('whole turns of heaters', () => {
  it('meet every phase and every floor [property]', () => {
    for (let seed = 1; seed <= CASES; seed++) {
      const { problem, phases } = inventProblem(seed, 0.1);
      const { turns, powersMw } = exchangeTurns(problem, leastTurns(problem, phases));
      for (let i = 0; i < HEATERS; i++) {
        let phase = 0;
        for (let j = 0; j < HEATERS; j++) phase += problem.gain[i * HEATERS + j]! * powersMw[j]!;
        expect(Math.abs(phase - phases[i]! - TURN * turns[i]!)).toBeLessThan(1e-9);
        expect(powersMw[i]!).toBeGreaterThanOrEqual(problem.floorMw[i]! - ROUNDING_MW);
      }
    }
  });

  it('without crosstalk are the fewest of each heater by itself [cross-check]', () => {
    // Source: ceil((floor − phase) / 2π) of every heater alone.
    const { problem, phases } = inventProblem(5, 0);
    const { turns } = exchangeTurns(problem, leastTurns(problem, phases));
    turns.forEach((count, i) => {
      const floorRad = problem.gain[i * HEATERS + i]! * problem.floorMw[i]!;
      expect(Math.abs(count - Math.ceil((floorRad - phases[i]!) / TURN))).toBe(0);
    });
  });

  it('take the certified least heat in 99 of 100 cases at 5 % crosstalk [cross-check]', () => {
    const cases = excesses(0.05);
    expect(cases.filter(({ exchanged }) => isOff(exchanged)).length).toBeLessThanOrEqual(CASES / 100);
  });

  it('stay within 6 % of the certified least heat at 10 % crosstalk, and gain by the exchange [cross-check]', () => {
    const cases = excesses(0.1);
    expect(Math.max(...cases.map(({ exchanged }) => exchanged))).toBeLessThan(0.06);
    const off = (kind: 'least' | 'exchanged') => cases.filter((one) => isOff(one[kind])).length;
    expect(off('least')).toBeGreaterThan(0);
    expect(off('exchanged')).toBeLessThan(off('least'));
  });

  it('trade turns between heaters where a limit would be passed [property]', () => {
    // Two heaters, the first just beyond its limit by crosstalk alone: more of the second lowers it.
    const gain = Float64Array.from([0.125, 0.02, 0.005, 0.125]);
    const floorMw = Float64Array.from([4, 4]);
    const wide = Float64Array.from([500, 500]);
    const unlimited = wrapProblem(gain, invert(gain, 2)!.inverse, floorMw, wide);
    const phases = Float64Array.from([6, 1]);
    const free = exchangeTurns(unlimited, leastTurns(unlimited, phases));
    const lower = Float64Array.from([free.powersMw[0]! - 1, 500]);
    const limited = wrapProblem(gain, unlimited.inverse, floorMw, lower);
    const found = exchangeTurns(limited, leastTurns(limited, phases));
    expect(found.violationMw).toBe(0);
    expect(found.powersMw[0]!).toBeLessThanOrEqual(limited.limitMw[0]!);
    expect(found.totalMw).toBeGreaterThan(free.totalMw);
  });
});
