import { readFileSync } from 'node:fs';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { NoConvergence } from '../../src/errors.ts';
import { type MinimaxProblem, minimiseMaximum, solveQuadraticProgramme } from '../../src/optimise/index.ts';

interface Reference {
  readonly entries: readonly {
    readonly id: string;
    readonly x0: readonly number[];
    readonly published: number;
    readonly value: number;
    readonly x: readonly number[];
  }[];
  readonly quadraticProgrammes: readonly {
    readonly g: readonly number[];
    readonly a: readonly number[];
    readonly C: readonly number[];
    readonly b: readonly number[];
    readonly f: number;
    readonly x: readonly number[];
  }[];
}

const reference = JSON.parse(
  readFileSync(new URL('../reference/optimise-minimax.json', import.meta.url), 'utf8'),
) as Reference;

type Functions = (x: Float64Array) => number[];

/** Central differences, accurate to 1e-10 on these smooth functions: enough for a minimum to 1e-8. */
const STEP = 1e-5;

function problemOf(
  unknowns: number,
  objectives: number,
  constraints: number,
  functions: Functions,
): MinimaxProblem {
  return {
    unknowns,
    objectives,
    constraints,
    evaluateInto: (x, values, jacobian) => {
      values.set(functions(x));
      if (jacobian === null) return;
      for (let k = 0; k < unknowns; k++) {
        const up = functions(x.map((value, at) => (at === k ? value + STEP : value)));
        const down = functions(x.map((value, at) => (at === k ? value - STEP : value)));
        for (let i = 0; i < up.length; i++) jacobian[i * unknowns + k] = (up[i]! - down[i]!) / (2 * STEP);
      }
    },
  };
}

const rosen = ([a, b, c, d]: readonly number[]): number =>
  a! ** 2 + b! ** 2 + 2 * c! ** 2 + d! ** 2 - 5 * a! - 5 * b! - 21 * c! + 7 * d!;
const suzuki = ([a, b, c, d]: readonly number[]): number[] => [
  a! ** 2 + b! ** 2 + c! ** 2 + d! ** 2 + a! - b! + c! - d! - 8,
  a! ** 2 + 2 * b! ** 2 + c! ** 2 + 2 * d! ** 2 - a! - d! - 10,
  2 * a! ** 2 + b! ** 2 + c! ** 2 + 2 * a! - b! - d! - 5,
];

const FUNCTIONS: Readonly<Record<string, Functions>> = {
  CB2: ([a, b]) => [a! ** 2 + b! ** 4, (2 - a!) ** 2 + (2 - b!) ** 2, 2 * Math.exp(b! - a!)],
  CB3: ([a, b]) => [a! ** 4 + b! ** 2, (2 - a!) ** 2 + (2 - b!) ** 2, 2 * Math.exp(b! - a!)],
  DEM: ([a, b]) => [5 * a! + b!, -5 * a! + b!, a! ** 2 + b! ** 2 + 4 * b!],
  MAD: ([a, b]) => [a! ** 2 + b! ** 2 + a! * b!, Math.sin(a!), Math.cos(b!)].flatMap((f) => [f, -f]),
  ROSEN_SUZUKI: (x) => {
    const f = rosen(Array.from(x));
    return [f, ...suzuki(Array.from(x)).map((c) => f + 10 * c)];
  },
};

const OPTIONS = {
  penalty: 10,
  window: Number.POSITIVE_INFINITY,
  gainTolerance: 1e-12,
  maximumEvaluations: 500,
  initialDamping: 1,
};

/** Agreement with the stored SciPy minima, themselves good to about 1e-9. */
const VALUE = 1e-7;
/** Optima recalled to seven digits. */
const RECALLED = 2e-7;

describe('minimax', () => {
  for (const entry of reference.entries) {
    it(`${entry.id}: the minimum that SciPy finds and the literature states (from memory) [cross-check]`, () => {
      const functions = FUNCTIONS[entry.id]!;
      const start = Float64Array.from(entry.x0);
      const problem = problemOf(start.length, functions(start).length, 0, functions);
      const result = minimiseMaximum(problem, start, OPTIONS);
      expect(Math.abs(result.value - entry.value)).toBeLessThan(VALUE);
      expect(Math.abs(result.value - entry.published)).toBeLessThan(RECALLED);
      for (let k = 1; k < result.trace.length; k++)
        expect(result.trace[k]!).toBeLessThan(result.trace[k - 1]!);
    });
  }

  it('Rosen-Suzuki as a constrained problem: −44 at (0, 1, 2, −1) (from memory) [published]', () => {
    const problem = problemOf(4, 1, 3, (x) => [rosen(Array.from(x)), ...suzuki(Array.from(x))]);
    const result = minimiseMaximum(problem, new Float64Array(4), OPTIONS);
    expect(result.value).toBeCloseTo(-44, 6);
    expect(result.violation).toBeLessThan(1e-8);
    [0, 1, 2, -1].forEach((value, k) => {
      expect(result.x[k]).toBeCloseTo(value, 4);
    });
  });

  it('keeps within limits and stops at the one that leads [property]', () => {
    const problem = { ...problemOf(1, 1, 0, ([x]) => [(x! - 3) ** 2]), upper: Float64Array.of(1) };
    const result = minimiseMaximum(problem, Float64Array.of(0), OPTIONS);
    expect(result.x[0]).toBeCloseTo(1, 9);
  });

  it('a start without finite values is NoConvergence; a budget used up is told, with the best point so far [property]', () => {
    const problem = problemOf(2, 3, 0, FUNCTIONS.CB2!);
    expect(() => minimiseMaximum(problem, Float64Array.of(Number.NaN, 0), OPTIONS)).toThrow(NoConvergence);
    const short = minimiseMaximum(problem, Float64Array.of(1, -0.1), { ...OPTIONS, maximumEvaluations: 3 });
    expect(short.stop).toBe('EVALUATIONS_USED');
    expect(short.value).toBeLessThan(short.trace[0]!);
  });

  it('stops once it is good enough [property]', () => {
    const problem = problemOf(2, 3, 0, FUNCTIONS.CB2!);
    const result = minimiseMaximum(problem, Float64Array.of(1, -0.1), { ...OPTIONS, goodEnough: 3 });
    expect(result.stop).toBe('GOOD_ENOUGH');
    expect(result.value).toBeLessThanOrEqual(3);
  });
});

describe('quadratic programme', () => {
  it('random problems: the minima that SciPy finds [cross-check]', () => {
    for (const { g, a, C, b, f, x } of reference.quadraticProgrammes) {
      const solution = solveQuadraticProgramme({
        diagonal: Float64Array.from(g),
        linear: Float64Array.from(a),
        rows: Float64Array.from(C),
        bounds: Float64Array.from(b),
      });
      expect(Math.abs(solution.value - f)).toBeLessThan(1e-9);
      x.forEach((value, k) => {
        expect(Math.abs(solution.x[k]! - value)).toBeLessThan(1e-8);
      });
    }
  });

  it('any feasible problem: stationary, feasible, multipliers non-negative (W. Karush 1939, H. Kuhn, A. Tucker 1951) [property]', () => {
    const size = fc.record({ n: fc.integer({ min: 1, max: 8 }), m: fc.integer({ min: 0, max: 30 }) });
    // Quarters: exact ties, repeated and dependent rows occur, absurdly small coefficients do not.
    const real = fc.integer({ min: -12, max: 12 }).map((value) => value / 4);
    fc.assert(
      fc.property(
        size.chain(({ n, m }) =>
          fc.record({
            diagonal: fc.array(
              fc.integer({ min: 1, max: 20 }).map((value) => value / 4),
              { minLength: n, maxLength: n },
            ),
            linear: fc.array(real, { minLength: n, maxLength: n }),
            rows: fc.array(real, { minLength: n * m, maxLength: n * m }),
            slack: fc.array(
              fc.integer({ min: 0, max: 8 }).map((value) => value / 4),
              { minLength: m, maxLength: m },
            ),
            inside: fc.array(real, { minLength: n, maxLength: n }),
          }),
        ),
        ({ diagonal, linear, rows, slack, inside }) => {
          const n = diagonal.length;
          const at = (i: number, x: ArrayLike<number>): number =>
            inside.reduce((sum, _, k) => sum + rows[i * n + k]! * x[k]!, 0);
          const bounds = slack.map((value, i) => at(i, inside) - value);
          const { x, active, multipliers } = solveQuadraticProgramme({
            diagonal: Float64Array.from(diagonal),
            linear: Float64Array.from(linear),
            rows: Float64Array.from(rows),
            bounds: Float64Array.from(bounds),
          });
          bounds.forEach((bound, i) => {
            expect(at(i, x)).toBeGreaterThan(bound - 2e-9);
          });
          active.forEach((i, k) => {
            expect(multipliers[k]!).toBeGreaterThanOrEqual(-1e-9);
            expect(Math.abs(at(i, x) - bounds[i]!)).toBeLessThan(1e-8);
          });
          for (let k = 0; k < n; k++) {
            const pull = active.reduce((sum, i, c) => sum + multipliers[c]! * rows[i * n + k]!, 0);
            const scale =
              1 + active.reduce((sum, i, c) => sum + multipliers[c]! * Math.abs(rows[i * n + k]!), 0);
            expect(Math.abs(diagonal[k]! * x[k]! + linear[k]! - pull) / scale).toBeLessThan(1e-8);
          }
        },
      ),
      { numRuns: 200, seed: 7 },
    );
  });

  it('constraints that contradict each other are NoConvergence [property]', () => {
    expect(() =>
      solveQuadraticProgramme({
        diagonal: Float64Array.of(1),
        linear: Float64Array.of(0),
        rows: Float64Array.of(1, -1),
        bounds: Float64Array.of(1, 1),
      }),
    ).toThrow(NoConvergence);
  });
});
