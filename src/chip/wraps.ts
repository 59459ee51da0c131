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
import { multiplyInto } from './linear.ts';

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
}

export interface WrapSolution {
  readonly turns: Int32Array;
  readonly powersMw: Float64Array;
  readonly totalMw: number;
  /** Sum of what passes limits or misses floors, mW; 0 where all hold. */
  readonly violationMw: number;
}

/** Whether `a` is the better of two: limits first, then the total. */
export function isBetter(a: WrapSolution, b: WrapSolution): boolean {
  const difference = a.violationMw - b.violationMw;
  if (Math.abs(difference) > SLACK_MW) return difference < 0;
  return a.totalMw < b.totalMw;
}

function violationOf(problem: WrapProblem, powersMw: Float64Array): number {
  let violation = 0;
  for (let i = 0; i < powersMw.length; i++) {
    const below = problem.floorMw[i]! - powersMw[i]!;
    const above = powersMw[i]! - problem.limitMw[i]!;
    if (below > SLACK_MW) violation += below;
    if (above > SLACK_MW) violation += above;
  }
  return violation;
}

function evaluate(problem: WrapProblem, phasesRad: Float64Array, turns: Int32Array): WrapSolution {
  const wanted = phasesRad.map((phase, i) => phase + TURN * turns[i]!);
  const powersMw = new Float64Array(turns.length);
  multiplyInto(powersMw, problem.inverse, wanted);
  let totalMw = 0;
  for (const power of powersMw) totalMw += power;
  return { turns, powersMw, totalMw, violationMw: violationOf(problem, powersMw) };
}

/** For every heater the fewest turns that any powers within floor and limit could have. */
function fewestTurns(problem: WrapProblem, phasesRad: Float64Array): Int32Array {
  const m = phasesRad.length;
  const turns = new Int32Array(m);
  for (let i = 0; i < m; i++) {
    let least = 0;
    for (let j = 0; j < m; j++) {
      const gain = problem.gain[i * m + j]!;
      least += gain * (gain >= 0 ? problem.floorMw[j]! : problem.limitMw[j]!);
    }
    turns[i] = Math.ceil((least - phasesRad[i]!) / TURN - SLACK_MW);
  }
  return turns;
}

/**
 * The componentwise least turns whose powers all reach their floors; limits are not looked at. Phases `phasesRad`
 * (m values) are relative to the phases at zero power. Cost O(m²) a pass, 2 to 5 passes.
 * Throws NoConvergence where crosstalk is so strong that raising one heater lowers others without end.
 */
export function leastTurns(problem: WrapProblem, phasesRad: Float64Array): WrapSolution {
  const m = phasesRad.length;
  const turns = fewestTurns(problem, phasesRad);
  for (let pass = 0; pass < MAX_RAISING_PASSES; pass++) {
    const solution = evaluate(problem, phasesRad, turns);
    let raised = false;
    for (let i = 0; i < m; i++) {
      const lacking = problem.floorMw[i]! - solution.powersMw[i]!;
      if (lacking <= SLACK_MW) continue;
      turns[i]! += Math.max(1, Math.ceil(lacking / (TURN * problem.inverse[i * m + i]!) - SLACK_MW));
      raised = true;
    }
    if (!raised) return solution;
  }
  const { violationMw } = evaluate(problem, phasesRad, turns);
  throw new NoConvergence('least heater turns', MAX_RAISING_PASSES, violationMw);
}

/** All exchanges of one turn on up to `most` heaters, as lists of [heater, ±1]. */
function* exchanges(m: number, most: number): Generator<readonly (readonly [number, number])[]> {
  const signs = [-1, 1] as const;
  for (let i = 0; i < m; i++)
    for (const si of signs) {
      yield [[i, si]];
      for (let j = i + 1; j < m && most >= 2; j++)
        for (const sj of signs) {
          yield [
            [i, si],
            [j, sj],
          ];
          for (let k = j + 1; k < m && most >= 3; k++)
            for (const sk of signs)
              yield [
                [i, si],
                [j, sj],
                [k, sk],
              ];
        }
    }
}

/**
 * Exchanges single turns, pairs and triples while limits are met better or the total falls. Returns a solution no
 * exchange improves. Cost O(m³) tries a pass; a try costs O(m) only where it lowers the total or limits are missed.
 */
export function exchangeTurns(problem: WrapProblem, start: WrapSolution): WrapSolution {
  const m = start.turns.length;
  const totalPerTurn = new Float64Array(m);
  for (let j = 0; j < m; j++)
    for (let i = 0; i < m; i++) totalPerTurn[j]! += TURN * problem.inverse[i * m + j]!;
  const most = m <= MAX_HEATERS_FOR_TRIPLES ? 3 : 2;
  let best = start;
  const trial = new Float64Array(m);
  for (let step = 0; step < MAX_EXCHANGES; step++) {
    let next: WrapSolution | null = null;
    for (const exchange of exchanges(m, most)) {
      let totalMw = best.totalMw;
      for (const [heater, sign] of exchange) totalMw += sign * totalPerTurn[heater]!;
      if (best.violationMw === 0 && totalMw >= (next ?? best).totalMw - SLACK_MW) continue;
      trial.set(best.powersMw);
      for (const [heater, sign] of exchange)
        for (let i = 0; i < m; i++) trial[i]! += sign * TURN * problem.inverse[i * m + heater]!;
      const candidate = {
        turns: best.turns,
        powersMw: trial,
        totalMw,
        violationMw: violationOf(problem, trial),
      };
      if (!isBetter(candidate, next ?? best)) continue;
      const turns = Int32Array.from(best.turns);
      for (const [heater, sign] of exchange) turns[heater]! += sign;
      next = { ...candidate, turns, powersMw: Float64Array.from(trial) };
    }
    if (next === null) return best;
    best = next;
  }
  throw new NoConvergence('exchange of heater turns', MAX_EXCHANGES, best.violationMw);
}
