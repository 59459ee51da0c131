/** Sign choices of couplers: the full search against itself in another order, the local search against the full one. */
import { describe, expect, it } from 'vitest';
import { searchBranches } from '../../src/chip/branches.ts';
import { invent } from './invented-chips.ts';

/** Heat that depends on each choice alone and on each pair of neighbours; all values invented. */
function inventHeat(count: number, seed: number) {
  const random = invent(seed);
  random();
  const own = Array.from({ length: count }, () => 40 * random());
  const shared = Array.from({ length: count }, () => 30 * random());
  return (branches: Uint8Array) => {
    let totalMw = 0;
    branches.forEach((sign, k) => {
      totalMw += (sign === 1 ? own[k]! : 20) + (sign === branches[(k + 1) % count] ? shared[k]! : 15);
    });
    const nothing = { turns: new Int32Array(0), powersMw: new Float64Array(0) };
    return { ...nothing, totalMw, violationMw: 0 };
  };
}

function least(count: number, heat: ReturnType<typeof inventHeat>): number {
  let best = Number.POSITIVE_INFINITY;
  for (let code = 2 ** count - 1; code >= 0; code--)
    best = Math.min(best, heat(Uint8Array.from({ length: count }, (_, k) => (code >> k) & 1)).totalMw);
  return best;
}

describe('coupler branches', () => {
  it('up to ten couplers are the least over every choice, best first [cross-check]', () => {
    for (let seed = 1; seed <= 5; seed++) {
      const heat = inventHeat(8, seed);
      const found = searchBranches(8, heat, 4);
      expect(found).toHaveLength(4);
      expect(found[0]!.solution.totalMw).toBe(least(8, heat));
      const totals = found.map(({ solution }) => solution.totalMw);
      expect(totals).toEqual([...totals].sort((a, b) => a - b));
    }
  });

  it('beyond ten couplers come within 2 % of the least over every choice [cross-check]', () => {
    for (let seed = 1; seed <= 10; seed++) {
      const heat = inventHeat(13, seed);
      const found = searchBranches(13, heat, 4)[0]!;
      expect(found.solution.totalMw).toBeLessThanOrEqual(1.02 * least(13, heat));
    }
  });

  it('without couplers are the one empty choice [property]', () => {
    expect(searchBranches(0, inventHeat(0, 1), 4)).toHaveLength(1);
  });
});
