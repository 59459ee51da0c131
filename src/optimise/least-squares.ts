/**
 * Nonlinear least squares by the Levenberg-Marquardt method in its trust-region form.
 *
 * Source: J. J. Moré, "The Levenberg-Marquardt algorithm: implementation and theory", in Numerical Analysis, Lecture
 * Notes in Mathematics 630, 105-116 (1978): scaling by the largest column norms so far (section 6), the parameter from
 * Newton's iteration on |D·p(λ)| = Δ (algorithm 5.5), the step control of algorithm 7.1; stop rules of section 8.
 */
import { NoConvergence } from '../errors.ts';
import { backSubstituteInto, forwardSubstituteInto, triangulariseInto } from './triangular.ts';

export interface LeastSquaresProblem {
  readonly unknowns: number;
  /** At least as many as unknowns. */
  readonly residuals: number;
  /** Fills the residuals and, where given, their Jacobian (row by row, one row a residual). */
  readonly evaluateInto: (x: Float64Array, residuals: Float64Array, jacobian: Float64Array | null) => void;
}

export interface LeastSquaresOptions {
  /** Stop where actual and predicted relative reductions of the sum of squares are below this. */
  readonly reductionTolerance: number;
  /** Stop where the trust region is this share of the scaled |x|. */
  readonly stepTolerance: number;
  /** Stop where the cosine between the residual and every column of the Jacobian is below this. */
  readonly gradientTolerance: number;
  readonly maximumEvaluations: number;
}

const LEAST_SQUARES_DEFAULTS: LeastSquaresOptions = {
  reductionTolerance: 1e-14,
  stepTolerance: 1e-12,
  gradientTolerance: 1e-14,
  maximumEvaluations: 2000,
};

export type LeastSquaresStop = 'REDUCTION' | 'STEP' | 'GRADIENT' | 'EXACT';

export interface LeastSquaresResult {
  readonly x: Float64Array;
  readonly sumOfSquares: number;
  readonly stop: LeastSquaresStop;
  readonly evaluations: number;
  /** Sum of squares after every accepted step, the start first. */
  readonly trace: readonly number[];
}

/** Δ₀ = this · |D·x₀| (or this alone at the origin), as recommended there. */
const INITIAL_RADIUS = 100;
/** |D·p| within this share of Δ is on the boundary. */
const BOUNDARY = 0.1;
/** Newton's iteration on λ meets that share in two or three steps; ten are never needed. */
const LAMBDA_ITERATIONS = 10;
const ACCEPT_RATIO = 1e-4;
const POOR_RATIO = 0.25;
const GOOD_RATIO = 0.75;
/** Pivot smaller than this share of the largest: the Jacobian is rank deficient and the full step is not defined. */
const RANK = 1e-14;

const normOf = (v: Float64Array): number => v.reduce((norm, value) => Math.hypot(norm, value), 0);

const scaledNorm = (scale: Float64Array, v: Float64Array): number =>
  v.reduce((norm, value, k) => Math.hypot(norm, scale[k]! * value), 0);

interface Step {
  readonly lambda: number;
  readonly length: number;
}

/** p(λ) and the triangle of [R; √λ·D] it was found with. */
function dampedStepInto(
  r: Float64Array,
  qtf: Float64Array,
  scale: Float64Array,
  lambda: number,
  work: { matrix: Float64Array; right: Float64Array },
  p: Float64Array,
): void {
  const n = p.length;
  work.matrix.fill(0);
  work.matrix.set(r.subarray(0, n * n));
  work.right.fill(0);
  for (let k = 0; k < n; k++) {
    work.right[k] = -qtf[k]!;
    work.matrix[(n + k) * n + k] = Math.sqrt(lambda) * scale[k]!;
  }
  if (lambda > 0) triangulariseInto(work.matrix, 2 * n, n, work.right);
  backSubstituteInto(work.matrix, n, work.right, p);
}

/** Gradient bound on λ: |D⁻¹Rᵀqtf|/Δ. */
function upperLambda(r: Float64Array, qtf: Float64Array, scale: Float64Array, radius: number): number {
  const n = scale.length;
  let norm = 0;
  for (let k = 0; k < n; k++) {
    let sum = 0;
    for (let i = 0; i <= k; i++) sum += r[i * n + k]! * qtf[i]!;
    norm = Math.hypot(norm, sum / scale[k]!);
  }
  return norm / radius;
}

/** Algorithm 5.5: the step within the region, damped only where the full one leaves it. */
function boundedStepInto(
  r: Float64Array,
  qtf: Float64Array,
  scale: Float64Array,
  radius: number,
  work: { matrix: Float64Array; right: Float64Array },
  p: Float64Array,
): Step {
  const n = p.length;
  let largest = 0;
  let smallest = Number.POSITIVE_INFINITY;
  for (let k = 0; k < n; k++) {
    largest = Math.max(largest, Math.abs(r[k * n + k]!));
    smallest = Math.min(smallest, Math.abs(r[k * n + k]!));
  }
  const fullRank = smallest > RANK * largest;
  let upper = upperLambda(r, qtf, scale, radius);
  let lower = 0;
  let lambda = 0;
  if (!fullRank) lambda = 1e-3 * upper;
  const q = new Float64Array(n);
  const direction = new Float64Array(n);
  let length = 0;
  for (let iteration = 0; iteration <= LAMBDA_ITERATIONS; iteration++) {
    dampedStepInto(r, qtf, scale, lambda, work, p);
    length = scaledNorm(scale, p);
    const excess = length - radius;
    if (Math.abs(excess) <= BOUNDARY * radius || (lambda === 0 && excess <= 0) || length === 0) break;
    // φ' = −|R_λ⁻ᵀ D² p|²/|D p|, with R_λ the triangle just used.
    for (let k = 0; k < n; k++) direction[k] = (scale[k]! * scale[k]! * p[k]!) / length;
    forwardSubstituteInto(work.matrix, n, direction, q);
    const slope = -length * q.reduce((sum, value) => sum + value * value, 0);
    if (excess > 0) lower = Math.max(lower, lambda);
    else upper = Math.min(upper, lambda);
    lower = Math.max(lower, lambda - excess / slope);
    const next = lambda - ((excess + radius) / radius) * (excess / slope);
    lambda = next > lower && next < upper ? next : Math.max(1e-3 * upper, Math.sqrt(lower * upper));
  }
  return { lambda, length };
}

/** Largest cosine between the residual and a column of the Jacobian. */
function gradientCosine(r: Float64Array, qtf: Float64Array, norms: Float64Array, size: number): number {
  const n = norms.length;
  let worst = 0;
  for (let k = 0; k < n; k++) {
    if (norms[k] === 0) continue;
    let sum = 0;
    for (let i = 0; i <= k; i++) sum += r[i * n + k]! * qtf[i]!;
    worst = Math.max(worst, Math.abs(sum) / (norms[k]! * size));
  }
  return worst;
}

/** Column norms of the Jacobian; the scale never shrinks. */
function updateScale(jacobian: Float64Array, m: number, norms: Float64Array, scale: Float64Array): void {
  const n = norms.length;
  for (let k = 0; k < n; k++) {
    let norm = 0;
    for (let i = 0; i < m; i++) norm = Math.hypot(norm, jacobian[i * n + k]!);
    norms[k] = norm;
    scale[k] = Math.max(scale[k]!, norm);
  }
}

/**
 * Local minimum of the sum of squares from `start`. One Jacobian an accepted step, one factorisation O(mn²). Rank
 * deficiency is stepped through damped. Throws RangeError for fewer residuals than unknowns, NoConvergence where the
 * start gives no finite residual or the evaluations run out.
 */
export function minimiseLeastSquares(
  problem: LeastSquaresProblem,
  start: Float64Array,
  options: Partial<LeastSquaresOptions> = {},
): LeastSquaresResult {
  const settled = { ...LEAST_SQUARES_DEFAULTS, ...options };
  const { unknowns: n, residuals: m } = problem;
  if (m < n) throw new RangeError(`Least squares of ${n} unknowns needs as many residuals; ${m} given.`);
  const x = Float64Array.from(start);
  const trial = new Float64Array(n);
  const f = new Float64Array(m);
  const trialF = new Float64Array(m);
  const jacobian = new Float64Array(m * n);
  const qtf = new Float64Array(m);
  const norms = new Float64Array(n);
  const scale = new Float64Array(n);
  const p = new Float64Array(n);
  const work = { matrix: new Float64Array(2 * n * n), right: new Float64Array(2 * n) };
  problem.evaluateInto(x, f, jacobian);
  let evaluations = 1;
  let size = normOf(f);
  if (!Number.isFinite(size))
    throw new NoConvergence('least squares (no finite residual at the start)', 1, size);
  const trace = [size * size];
  let radius = 0;
  const done = (stop: LeastSquaresStop): LeastSquaresResult => ({
    x,
    sumOfSquares: size * size,
    stop,
    evaluations,
    trace,
  });
  for (;;) {
    updateScale(jacobian, m, norms, scale);
    const weights = scale.map((value) => (value === 0 ? 1 : value));
    if (radius === 0) radius = INITIAL_RADIUS * (scaledNorm(weights, x) || 1);
    qtf.set(f);
    triangulariseInto(jacobian, m, n, qtf);
    if (size === 0) return done('EXACT');
    if (gradientCosine(jacobian, qtf, norms, size) <= settled.gradientTolerance) return done('GRADIENT');
    for (let accepted = false; !accepted; ) {
      if (evaluations >= settled.maximumEvaluations)
        throw new NoConvergence('least squares', evaluations, size);
      const { lambda, length } = boundedStepInto(jacobian, qtf, weights, radius, work, p);
      if (trace.length === 1) radius = Math.min(radius, length || radius);
      for (let k = 0; k < n; k++) trial[k] = x[k]! + p[k]!;
      problem.evaluateInto(trial, trialF, null);
      evaluations += 1;
      const trialSize = normOf(trialF);
      const actual = 0.1 * trialSize < size ? 1 - (trialSize / size) ** 2 : -1;
      let linear = 0;
      for (let i = 0; i < n; i++) {
        let sum = 0;
        for (let k = i; k < n; k++) sum += jacobian[i * n + k]! * p[k]!;
        linear = Math.hypot(linear, sum);
      }
      const linearShare = (linear / size) ** 2;
      const dampedShare = lambda * (length / size) ** 2;
      const predicted = linearShare + 2 * dampedShare;
      const ratio = predicted > 0 ? actual / predicted : 0;
      if (!(ratio > POOR_RATIO)) {
        const directional = -(linearShare + dampedShare);
        let shrink = actual >= 0 ? 0.5 : (0.5 * directional) / (directional + 0.5 * actual);
        if (!(0.1 * trialSize < size) || !(shrink >= 0.1)) shrink = 0.1;
        radius = shrink * Math.min(radius, length / 0.1);
      } else if (ratio >= GOOD_RATIO || lambda === 0) radius = 2 * length;
      accepted = ratio >= ACCEPT_RATIO;
      if (accepted) {
        x.set(trial);
        size = trialSize;
        trace.push(size * size);
        problem.evaluateInto(x, f, jacobian);
      }
      if (
        Math.abs(actual) <= settled.reductionTolerance &&
        predicted <= settled.reductionTolerance &&
        ratio <= 2
      )
        return done('REDUCTION');
      if (radius <= settled.stepTolerance * scaledNorm(weights, x)) return done('STEP');
    }
  }
}
