/**
 * Smooth-minimax with constraints: F(x) = max_i f_i(x) + μ·max(0, max_j c_j(x)), by damped linearisation. Each step
 * solves the convex model (all f and c linearised at x, plus ½λ|d|²) as a quadratic programme; λ follows the ratio of
 * actual to predicted descent.
 *
 * Sources: K. Madsen, "An algorithm for minimax solution of overdetermined systems of non-linear equations", J. Inst.
 * Maths Applics 16, 321-328 (1975) (linearise all functions, bound the step, ratio test); R. Fletcher, "A model algorithm
 * for composite nondifferentiable optimization problems", Math. Programming Study 17, 67-76 (1982) (the composite form and
 * its exact penalty); R. Fletcher, "Second order corrections for non-differentiable optimization", in Lecture Notes in
 * Mathematics 912, 85-114 (1982) (a poor step is bent along the curved constraints before it is given up); the damped step in place of a trust region as in K. Levenberg, Q. Appl. Math. 2, 164 (1944) (from memory).
 */
import { NoConvergence } from '../errors.ts';
import { solveQuadraticProgramme } from './quadratic-programme.ts';

export interface MinimaxProblem {
  /** Number of unknowns. */
  readonly unknowns: number;
  /** Functions whose maximum is minimised, the first `objectives` values. At least one. */
  readonly objectives: number;
  /** Functions kept ≤ 0, the values after them. */
  readonly constraints: number;
  /** Fills values (objectives + constraints) and, where given, the Jacobian (row by row, one row a function). */
  readonly evaluateInto: (x: Float64Array, values: Float64Array, jacobian: Float64Array | null) => void;
  readonly lower?: Float64Array;
  readonly upper?: Float64Array;
  /** Weight of each unknown in |d|²; 1 where absent. */
  readonly weights?: Float64Array;
}

export interface MinimaxOptions {
  /** μ: price of one unit of violation. Larger than any trade the problem can offer, or constraints are given up. */
  readonly penalty: number;
  /** Functions this far below the leading one are left out of the step's model; the ratio test guards the choice. */
  readonly window: number;
  /** Stop where a step can gain no more than this. */
  readonly gainTolerance: number;
  readonly maximumEvaluations: number;
  /** Stop as soon as no constraint is violated and the greatest objective is at or below this. */
  readonly goodEnough?: number;
  /** Damping of the first step, in units of F per squared unknown. */
  readonly initialDamping: number;
}

export type MinimaxStop = 'GOOD_ENOUGH' | 'NO_GAIN_LEFT' | 'STEP_TOO_SMALL' | 'EVALUATIONS_USED';

export interface MinimaxResult {
  readonly x: Float64Array;
  /** Greatest objective. */
  readonly value: number;
  /** Greatest constraint (−∞ without constraints); ≤ 0 where all are kept. */
  readonly violation: number;
  readonly stop: MinimaxStop;
  readonly evaluations: number;
  /** F after every accepted step, the start first. */
  readonly trace: readonly number[];
}

/** λ shrinks and grows by these; the ratios are the customary quarter and three quarters. */
const LOOSEN = 0.3;
const TIGHTEN = 4;
const POOR_RATIO = 0.25;
const GOOD_RATIO = 0.75;
const ACCEPT_RATIO = 1e-4;
/** Beyond this damping a step is below rounding. */
const MAXIMUM_DAMPING = 1e14;
const MINIMUM_DAMPING = 1e-9;
/** Curvature that makes the two bounding unknowns of the model strictly convex; small against their slopes 1 and μ. */
const BOUND_CURVATURE = 1e-7;

interface Leading {
  readonly value: number;
  readonly violation: number;
}

function leading(problem: MinimaxProblem, values: Float64Array): Leading {
  let value = Number.NEGATIVE_INFINITY;
  let violation = Number.NEGATIVE_INFINITY;
  for (let i = 0; i < problem.objectives; i++) value = Math.max(value, values[i]!);
  for (let i = problem.objectives; i < values.length; i++) violation = Math.max(violation, values[i]!);
  return { value, violation };
}

const merit = (at: Leading, penalty: number): number => at.value + penalty * Math.max(0, at.violation);

interface Model {
  readonly rows: Float64Array;
  readonly bounds: Float64Array;
  readonly linear: Float64Array;
}

/** Values that, linearised with the same slopes, are right at x + d instead of at x. */
function bentInto(
  n: number,
  jacobian: Float64Array,
  trialValues: Float64Array,
  step: Float64Array,
  bent: Float64Array,
): void {
  for (let i = 0; i < bent.length; i++) {
    let value = trialValues[i]!;
    for (let k = 0; k < n; k++) value -= jacobian[i * n + k]! * step[k]!;
    bent[i] = value;
  }
}

/** Rows of the model in the unknowns (d, v, w): f_i + g_i·d ≤ f + v, c_j + g_j·d ≤ w, w ≥ 0, limits of x + d. */
function buildModel(
  problem: MinimaxProblem,
  x: Float64Array,
  values: Float64Array,
  jacobian: Float64Array,
  at: Leading,
  options: MinimaxOptions,
): Model {
  const n = problem.unknowns;
  const width = n + 2;
  const rows: number[] = [];
  const bounds: number[] = [];
  for (let i = 0; i < values.length; i++) {
    const isObjective = i < problem.objectives;
    const reference = isObjective ? at.value : Math.max(0, at.violation);
    if (values[i]! < reference - options.window) continue;
    for (let k = 0; k < n; k++) rows.push(-jacobian[i * n + k]!);
    rows.push(isObjective ? 1 : 0, isObjective ? 0 : 1);
    bounds.push(isObjective ? values[i]! - at.value : values[i]!);
  }
  const single = (index: number, sign: number, bound: number): void => {
    for (let k = 0; k < width; k++) rows.push(k === index ? sign : 0);
    bounds.push(bound);
  };
  single(n + 1, 1, 0);
  for (let k = 0; k < n; k++) {
    const low = problem.lower?.[k] ?? Number.NEGATIVE_INFINITY;
    const high = problem.upper?.[k] ?? Number.POSITIVE_INFINITY;
    if (Number.isFinite(low)) single(k, 1, low - x[k]!);
    if (Number.isFinite(high)) single(k, -1, x[k]! - high);
  }
  const linear = new Float64Array(width);
  linear[n] = 1;
  linear[n + 1] = options.penalty;
  return { rows: Float64Array.from(rows), bounds: Float64Array.from(bounds), linear };
}

/**
 * Local minimum of F from `start`, which must lie within the limits. Cost per step one Jacobian and one quadratic
 * programme of n+2 unknowns. Converges quadratically where as many functions lead as there are unknowns plus one,
 * linearly elsewhere. Throws NoConvergence where the functions give NaN at the start; running out of evaluations is
 * a stop, told in the result, because the best point so far is still worth having.
 */
export function minimiseMaximum(
  problem: MinimaxProblem,
  start: Float64Array,
  options: MinimaxOptions,
): MinimaxResult {
  const n = problem.unknowns;
  const count = problem.objectives + problem.constraints;
  const x = Float64Array.from(start);
  const trial = new Float64Array(n);
  const values = new Float64Array(count);
  const trialValues = new Float64Array(count);
  const jacobian = new Float64Array(count * n);
  problem.evaluateInto(x, values, jacobian);
  let evaluations = 1;
  let at = leading(problem, values);
  let current = merit(at, options.penalty);
  if (!Number.isFinite(current))
    throw new NoConvergence('minimax (no finite value at the start)', 1, current);
  const trace = [current];
  let damping = options.initialDamping;
  let stop: MinimaxStop = 'EVALUATIONS_USED';
  const diagonal = new Float64Array(n + 2);
  const bent = new Float64Array(count);
  const goodEnough = options.goodEnough ?? Number.NEGATIVE_INFINITY;
  let model = buildModel(problem, x, values, jacobian, at, options);
  /** Solves a model and evaluates its step into `trial`; returns the step and the merit there. */
  const attempt = (rows: Model): { step: Float64Array; at: Leading; merit: number } => {
    const { x: step } = solveQuadraticProgramme({ diagonal, ...rows });
    for (let k = 0; k < n; k++) trial[k] = x[k]! + step[k]!;
    problem.evaluateInto(trial, trialValues, null);
    evaluations += 1;
    const trialAt = leading(problem, trialValues);
    return { step, at: trialAt, merit: merit(trialAt, options.penalty) };
  };
  while (evaluations < options.maximumEvaluations) {
    if (current <= goodEnough) {
      stop = 'GOOD_ENOUGH';
      break;
    }
    for (let k = 0; k < n; k++) diagonal[k] = damping * (problem.weights?.[k] ?? 1);
    diagonal.fill(BOUND_CURVATURE, n);
    let tried = attempt(model);
    const predicted =
      current - (at.value + tried.step[n]! + options.penalty * Math.max(0, tried.step[n + 1]!));
    if (predicted < options.gainTolerance) {
      if (damping <= options.initialDamping || predicted <= 0) {
        stop = damping <= options.initialDamping ? 'NO_GAIN_LEFT' : 'STEP_TOO_SMALL';
        break;
      }
      // A heavily damped step proves nothing: loosen until a free one agrees.
      damping *= LOOSEN;
      continue;
    }
    let ratio = (current - tried.merit) / predicted;
    if (!(ratio >= POOR_RATIO)) {
      bentInto(n, jacobian, trialValues, tried.step, bent);
      const corrected = attempt(buildModel(problem, x, bent, jacobian, at, options));
      const correctedRatio = (current - corrected.merit) / predicted;
      if (correctedRatio > ratio || Number.isNaN(ratio)) {
        tried = corrected;
        ratio = correctedRatio;
      } else damping *= TIGHTEN;
    }
    if (ratio > ACCEPT_RATIO) {
      for (let k = 0; k < n; k++) x[k] = x[k]! + tried.step[k]!;
      problem.evaluateInto(x, values, jacobian);
      at = tried.at;
      current = tried.merit;
      trace.push(current);
      model = buildModel(problem, x, values, jacobian, at, options);
    }
    if (!(ratio >= POOR_RATIO)) damping *= TIGHTEN;
    else if (ratio > GOOD_RATIO) damping = Math.max(MINIMUM_DAMPING, damping * LOOSEN);
    if (damping > MAXIMUM_DAMPING) {
      stop = 'STEP_TOO_SMALL';
      break;
    }
  }
  return { x, value: at.value, violation: at.violation, stop, evaluations, trace };
}
