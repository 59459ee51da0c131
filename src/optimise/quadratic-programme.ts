/**
 * Strictly convex quadratic programme with a diagonal Hessian, by the dual active-set method.
 *
 * Source: D. Goldfarb and A. Idnani, "A numerically stable dual method for solving strictly convex quadratic programs",
 * Math. Programming 27, 1-33 (1983), algorithm of section 3 with the J/R factors of section 4 (from memory).
 */
import { NoConvergence } from '../errors.ts';

/** Each pass adds or drops one constraint; far more passes than this per unknown and constraint means cycling. */
const PASSES_PER_CONSTRAINT = 4;

/** A constraint counts as met within this share of the size of its own terms. */
const MET = 1e-12;

/** A constraint dependent on the active ones and missed by less than this is met as nearly as rounding allows. */
const ROUNDING = 1e-9;

/** A normal is taken as dependent on the active ones when what is left of it is smaller than this share. */
const DEPENDENT = 1e-13;

export interface QuadraticProgramme {
  /** Diagonal of G, all > 0; length n. */
  readonly diagonal: Float64Array;
  /** Linear term a; length n. */
  readonly linear: Float64Array;
  /** m constraint normals, row by row (m·n): row·x ≥ bound. */
  readonly rows: Float64Array;
  readonly bounds: Float64Array;
}

export interface QuadraticSolution {
  readonly x: Float64Array;
  /** Value of ½x′Gx + a′x. */
  readonly value: number;
  /** Constraints active at the solution. */
  readonly active: readonly number[];
  /** Their multipliers, ≥ 0. */
  readonly multipliers: readonly number[];
}

interface ActiveSet {
  readonly n: number;
  /** n × n, row by row: J = L⁻ᵀQ. */
  readonly j: Float64Array;
  /** n × n, row by row, upper triangle of the first `size` columns. */
  readonly r: Float64Array;
  size: number;
  readonly active: Int32Array;
  readonly multipliers: Float64Array;
}

/** Rotates columns a and b of J by the Givens pair (c, s). */
function rotateColumns(set: ActiveSet, a: number, b: number, c: number, s: number): void {
  const { n, j } = set;
  for (let i = 0; i < n; i++) {
    const left = j[i * n + a]!;
    const right = j[i * n + b]!;
    j[i * n + a] = c * left + s * right;
    j[i * n + b] = c * right - s * left;
  }
}

/** Appends the constraint whose Jᵀn is `d`; rotates d's tail into one entry. */
function addConstraint(set: ActiveSet, constraint: number, d: Float64Array): void {
  const { n, r, size } = set;
  for (let k = n - 1; k > size; k--) {
    const radius = Math.hypot(d[k - 1]!, d[k]!);
    if (radius === 0) continue;
    const c = d[k - 1]! / radius;
    const s = d[k]! / radius;
    d[k - 1] = radius;
    d[k] = 0;
    rotateColumns(set, k - 1, k, c, s);
  }
  for (let i = 0; i <= size; i++) r[i * n + size] = d[i]!;
  set.active[size] = constraint;
  set.size = size + 1;
}

/** Removes the active constraint at `position` and restores R to triangular form. */
function dropConstraint(set: ActiveSet, position: number): void {
  const { n, r, active, multipliers } = set;
  for (let column = position; column < set.size - 1; column++) {
    active[column] = active[column + 1]!;
    multipliers[column] = multipliers[column + 1]!;
    for (let i = 0; i <= column + 1; i++) r[i * n + column] = r[i * n + column + 1]!;
  }
  multipliers[set.size - 1] = multipliers[set.size]!;
  multipliers[set.size] = 0;
  set.size -= 1;
  for (let column = position; column < set.size; column++) {
    const radius = Math.hypot(r[column * n + column]!, r[(column + 1) * n + column]!);
    if (radius === 0) continue;
    const c = r[column * n + column]! / radius;
    const s = r[(column + 1) * n + column]! / radius;
    for (let k = column; k < set.size; k++) {
      const upper = r[column * n + k]!;
      const lower = r[(column + 1) * n + k]!;
      r[column * n + k] = c * upper + s * lower;
      r[(column + 1) * n + k] = c * lower - s * upper;
    }
    rotateColumns(set, column, column + 1, c, s);
  }
}

/** Most violated constraint, measured against the size of its terms; −1 where all are met. */
function mostViolated(problem: QuadraticProgramme, x: Float64Array, settled: Uint8Array): number {
  const n = x.length;
  let worst = -1;
  let worstSlack = -MET;
  for (let i = 0; i < problem.bounds.length; i++) {
    if (settled[i] === 1) continue;
    let value = -problem.bounds[i]!;
    let size = Math.abs(value) + 1;
    for (let k = 0; k < n; k++) {
      const term = problem.rows[i * n + k]! * x[k]!;
      value += term;
      size += Math.abs(term);
    }
    if (value / size < worstSlack) {
      worstSlack = value / size;
      worst = i;
    }
  }
  return worst;
}

/** d = Jᵀ·normal, z = J₂d₂ (primal direction), r = R⁻¹d₁ (dual direction). */
function directionsInto(
  set: ActiveSet,
  normal: Float64Array,
  d: Float64Array,
  z: Float64Array,
  dual: Float64Array,
): void {
  const { n, j, r, size } = set;
  d.fill(0);
  for (let i = 0; i < n; i++) for (let k = 0; k < n; k++) d[k] = d[k]! + j[i * n + k]! * normal[i]!;
  for (let i = 0; i < n; i++) {
    let sum = 0;
    for (let k = size; k < n; k++) sum += j[i * n + k]! * d[k]!;
    z[i] = sum;
  }
  for (let i = size - 1; i >= 0; i--) {
    let sum = d[i]!;
    for (let k = i + 1; k < size; k++) sum -= r[i * n + k]! * dual[k]!;
    dual[i] = sum / r[i * n + i]!;
  }
}

/** The active constraint whose multiplier reaches zero first along the dual direction. */
function firstToLeave(set: ActiveSet, dual: Float64Array): { step: number; position: number } {
  let step = Number.POSITIVE_INFINITY;
  let position = -1;
  for (let k = 0; k < set.size; k++) {
    if (dual[k]! > 0 && set.multipliers[k]! / dual[k]! < step) {
      step = set.multipliers[k]! / dual[k]!;
      position = k;
    }
  }
  return { step, position };
}

/**
 * Minimises ½x′Gx + a′x subject to rows·x ≥ bounds. n unknowns, m constraints; O(n²) a pass plus O(mn) for the choice of
 * the next constraint. Throws NoConvergence where the constraints contradict each other or the passes run out.
 */
export function solveQuadraticProgramme(problem: QuadraticProgramme): QuadraticSolution {
  const n = problem.diagonal.length;
  const m = problem.bounds.length;
  const x = problem.linear.map((a, k) => -a / problem.diagonal[k]!);
  const set: ActiveSet = {
    n,
    j: new Float64Array(n * n),
    r: new Float64Array(n * n),
    size: 0,
    active: new Int32Array(n + 1),
    multipliers: new Float64Array(n + 2),
  };
  for (let k = 0; k < n; k++) set.j[k * n + k] = 1 / Math.sqrt(problem.diagonal[k]!);
  const d = new Float64Array(n);
  const z = new Float64Array(n);
  const dual = new Float64Array(n);
  const maximumPasses = PASSES_PER_CONSTRAINT * (n + m) + PASSES_PER_CONSTRAINT;
  let passes = 0;
  const settled = new Uint8Array(m);
  for (;;) {
    const next = mostViolated(problem, x, settled);
    if (next < 0) break;
    const normal = problem.rows.subarray(next * n, next * n + n);
    set.multipliers[set.size] = 0;
    for (let added = false; !added && settled[next] === 0; ) {
      if (++passes > maximumPasses) throw new NoConvergence('quadratic programme', passes, Number.NaN);
      directionsInto(set, normal, d, z, dual);
      let slope = 0;
      let squared = 0;
      let slack = -problem.bounds[next]!;
      for (let k = 0; k < n; k++) {
        slope += z[k]! * normal[k]!;
        squared += d[k]! * d[k]!;
        slack += normal[k]! * x[k]!;
      }
      const full = slope > DEPENDENT * squared ? -slack / slope : Number.POSITIVE_INFINITY;
      const leaving = firstToLeave(set, dual);
      const step = Math.min(full, leaving.step);
      if (step === Number.POSITIVE_INFINITY && -slack < ROUNDING) {
        settled[next] = 1;
        continue;
      }
      if (step === Number.POSITIVE_INFINITY)
        throw new NoConvergence('quadratic programme (constraints contradict each other)', passes, -slack);
      if (full < Number.POSITIVE_INFINITY) for (let k = 0; k < n; k++) x[k] = x[k]! + step * z[k]!;
      for (let k = 0; k < set.size; k++) set.multipliers[k] = set.multipliers[k]! - step * dual[k]!;
      set.multipliers[set.size] = set.multipliers[set.size]! + step;
      added = full <= leaving.step;
      if (added) addConstraint(set, next, d);
      else dropConstraint(set, leaving.position);
    }
  }
  let value = 0;
  for (let k = 0; k < n; k++) value += x[k]! * (0.5 * problem.diagonal[k]! * x[k]! + problem.linear[k]!);
  return {
    x,
    value,
    active: Array.from(set.active.subarray(0, set.size)),
    multipliers: Array.from(set.multipliers.subarray(0, set.size)),
  };
}
