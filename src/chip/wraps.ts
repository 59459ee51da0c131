/**
 * Heater powers from wanted phases, each of them free by whole turns: P = W·(b + 2πn), n whole, P_i ≥ floor_i,
 * Σ P_i least, where W is the inverse of the matrix A of phase per power.
 *
 * With the off-diagonal entries of W ≤ 0 (weak thermal crosstalk) the feasible n have a componentwise least element:
 * for two feasible n the componentwise smaller of both is feasible too (the class of matrices is that of A. Berman,
 * R. J. Plemmons, "Nonnegative Matrices in the Mathematical Sciences" (1979), chapter 6). It is found from below: raise
 * every n_i whose heater is under its floor, until none is. With stronger crosstalk W has small positive off-diagonal
 * entries, and an exchange of up to three turns at once lowers the sum further; a certificate (branch and bound over
 * all n) is part of the tests, not of the product.
 */
import { NoConvergence } from '../errors.ts';

const TURN = 2 * Math.PI;

/** Every pass raises at least one turn; a diagonally dominant W settles within 5, so 200 means it is not one. */
const MAX_RAISING_PASSES = 200;

/** Every exchange lowers the cost; tens are usual for tens of heaters. */
const MAX_EXCHANGES = 10_000;

/** Beyond this many heaters three at once cost more than they bring: pairs only. */
const MAX_HEATERS_FOR_TRIPLES = 32;

/** mW by which a power may miss its floor or limit and count as on it: far below any driver step. */
const SLACK_MW = 1e-9;

export interface WrapProblem {
  /** Phase per power, rad/mW, m × m row by row; and its inverse. */
  readonly gain: Float64Array;
  readonly inverse: Float64Array;
  readonly floorMw: Float64Array;
  readonly limitMw: Float64Array;
  /** Least phase above rest that powers within floor and limit can give each element, rad. */
  readonly leastRad: Float64Array;
  /** What one turn more of a heater adds to the total, mW. */
  readonly totalPerTurnMw: Float64Array;
  /** Off-diagonals of W ≤ 0 and no turn lowers the total: the least turns are then the least heat, without exchange. */
  readonly leastIsBest: boolean;
}

export function wrapProblem(
  gain: Float64Array,
  inverse: Float64Array,
  floorMw: Float64Array,
  limitMw: Float64Array,
): WrapProblem {
  const m = floorMw.length;
  const leastRad = new Float64Array(m);
  const totalPerTurnMw = new Float64Array(m);
  for (let i = 0; i < m; i++)
    for (let j = 0; j < m; j++) {
      const entry = gain[i * m + j]!;
      leastRad[i]! += entry * (entry >= 0 ? floorMw[j]! : limitMw[j]!);
      totalPerTurnMw[j]! += TURN * inverse[i * m + j]!;
    }
  const leastIsBest =
    totalPerTurnMw.every((turn) => turn >= 0) && inverse.every((w, k) => k % (m + 1) === 0 || w <= 0);
  return { gain, inverse, floorMw, limitMw, leastRad, totalPerTurnMw, leastIsBest };
}

/** What a choice of turns costs. */
export interface HeatCost {
  readonly totalMw: number;
  /** Sum of what passes limits or misses floors, mW; 0 where all hold. */
  readonly violationMw: number;
}

export interface WrapSolution extends HeatCost {
  readonly turns: Int32Array;
  readonly powersMw: Float64Array;
}

/** Whether `a` is the better of two: limits first, then the total. */
export function isBetter(a: HeatCost, b: HeatCost): boolean {
  const difference = a.violationMw - b.violationMw;
  if (Math.abs(difference) > SLACK_MW) return difference < 0;
  return a.totalMw < b.totalMw;
}

function missedMw(problem: WrapProblem, heater: number, powerMw: number): number {
  const below = problem.floorMw[heater]! - powerMw;
  if (below > SLACK_MW) return below;
  const above = powerMw - problem.limitMw[heater]!;
  return above > SLACK_MW ? above : 0;
}

/**
 * The componentwise least turns whose powers all reach their floors; limits are only counted. Phases `phasesRad`
 * (m values) are relative to the phases at zero power. Cost O(m²) to start with and O(m) for each turn raised.
 * Throws NoConvergence where crosstalk is so strong that raising one heater lowers others without end.
 */
export function leastTurns(problem: WrapProblem, phasesRad: Float64Array): WrapSolution {
  const { inverse, floorMw, leastRad } = problem;
  const m = phasesRad.length;
  const turns = new Int32Array(m);
  const powersMw = new Float64Array(m);
  for (let j = 0; j < m; j++) {
    turns[j] = Math.ceil((leastRad[j]! - phasesRad[j]!) / TURN - SLACK_MW);
    const wanted = phasesRad[j]! + TURN * turns[j]!;
    for (let i = 0; i < m; i++) powersMw[i]! += inverse[i * m + j]! * wanted;
  }
  let settled = false;
  for (let pass = 0; !settled; pass++) {
    settled = true;
    for (let i = 0; i < m; i++) {
      const lacking = floorMw[i]! - powersMw[i]!;
      if (lacking <= SLACK_MW) continue;
      if (pass >= MAX_RAISING_PASSES)
        throw new NoConvergence('least heater turns', MAX_RAISING_PASSES, lacking);
      const more = Math.max(1, Math.ceil(lacking / (TURN * inverse[i * m + i]!) - SLACK_MW));
      turns[i]! += more;
      for (let r = 0; r < m; r++) powersMw[r]! += more * TURN * inverse[r * m + i]!;
      settled = false;
    }
  }
  let totalMw = 0;
  let violationMw = 0;
  for (let i = 0; i < m; i++) {
    totalMw += powersMw[i]!;
    violationMw += missedMw(problem, i, powersMw[i]!);
  }
  return { turns, powersMw, totalMw, violationMw };
}

/** The best exchange of a scan so far: heaters and ±1 each, `size` of them; 0 while none helps. */
interface Scan {
  readonly heaters: Int32Array;
  readonly signs: Int32Array;
  size: number;
  totalMw: number;
  violationMw: number;
}

/** Takes over the exchange in the first `size` of `heaters` and `signs` where it beats the best of the scan. */
function consider(
  problem: WrapProblem,
  from: WrapSolution,
  heaters: Int32Array,
  signs: Int32Array,
  size: number,
  best: Scan,
): void {
  let totalMw = from.totalMw;
  for (let q = 0; q < size; q++) totalMw += signs[q]! * problem.totalPerTurnMw[heaters[q]!]!;
  if (best.violationMw === 0 && totalMw >= best.totalMw - SLACK_MW) return;
  const m = from.powersMw.length;
  let violationMw = 0;
  for (let r = 0; r < m; r++) {
    let power = from.powersMw[r]!;
    for (let q = 0; q < size; q++) power += signs[q]! * TURN * problem.inverse[r * m + heaters[q]!]!;
    violationMw += missedMw(problem, r, power);
    if (violationMw > best.violationMw + SLACK_MW) return;
  }
  if (violationMw > best.violationMw - SLACK_MW && totalMw >= best.totalMw - SLACK_MW) return;
  best.heaters.set(heaters);
  best.signs.set(signs);
  best.size = size;
  best.totalMw = totalMw;
  best.violationMw = violationMw;
}

function scanExchanges(problem: WrapProblem, from: WrapSolution, best: Scan): void {
  const m = from.turns.length;
  const triples = m <= MAX_HEATERS_FOR_TRIPLES;
  const heaters = new Int32Array(3);
  const signs = new Int32Array(3);
  for (let i = 0; i < m; i++)
    for (let si = -1; si <= 1; si += 2) {
      heaters[0] = i;
      signs[0] = si;
      consider(problem, from, heaters, signs, 1, best);
      for (let j = i + 1; j < m; j++)
        for (let sj = -1; sj <= 1; sj += 2) {
          heaters[1] = j;
          signs[1] = sj;
          consider(problem, from, heaters, signs, 2, best);
          for (let k = triples ? j + 1 : m; k < m; k++)
            for (let sk = -1; sk <= 1; sk += 2) {
              heaters[2] = k;
              signs[2] = sk;
              consider(problem, from, heaters, signs, 3, best);
            }
        }
    }
}

/**
 * From the least turns: exchanges single turns, pairs and triples while limits are met better or the total falls.
 * Returns a solution no exchange improves. Cost O(m³) tries a pass; a try costs O(m) only where it lowers the total or
 * limits are missed.
 */
export function exchangeTurns(problem: WrapProblem, start: WrapSolution): WrapSolution {
  if (problem.leastIsBest && start.violationMw === 0) return start;
  const m = start.turns.length;
  let current = start;
  for (let step = 0; step < MAX_EXCHANGES; step++) {
    const { totalMw, violationMw } = current;
    const best: Scan = {
      heaters: new Int32Array(3),
      signs: new Int32Array(3),
      size: 0,
      totalMw,
      violationMw,
    };
    scanExchanges(problem, current, best);
    if (best.size === 0) return current;
    const turns = Int32Array.from(current.turns);
    const powersMw = Float64Array.from(current.powersMw);
    for (let q = 0; q < best.size; q++) {
      turns[best.heaters[q]!]! += best.signs[q]!;
      for (let r = 0; r < m; r++)
        powersMw[r]! += best.signs[q]! * TURN * problem.inverse[r * m + best.heaters[q]!]!;
    }
    current = { turns, powersMw, totalMw: best.totalMw, violationMw: best.violationMw };
  }
  throw new NoConvergence('exchange of heater turns', MAX_EXCHANGES, current.violationMw);
}
