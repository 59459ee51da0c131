import { readFileSync } from 'node:fs';
import { Complex } from 'complex.js';
import { describe, expect, it } from 'vitest';
import { NoConvergence } from '../../src/errors.ts';
import { type LeastSquaresProblem, minimiseLeastSquares } from '../../src/optimise/index.ts';

interface Dataset {
  readonly id: string;
  readonly data: readonly (readonly number[])[];
  readonly starts: readonly (readonly number[])[];
  readonly certified: { readonly b: readonly number[]; readonly rss: number };
}

const read = <T>(name: string): T[] =>
  (JSON.parse(readFileSync(new URL(`../reference/${name}`, import.meta.url), 'utf8')) as { entries: T[] })
    .entries;

/** Derivatives by the complex step (W. Squire, G. Trapp, SIAM Rev. 40, 110 (1998)): exact to rounding. */
const STEP = 1e-30;

type Residual = (b: readonly Complex[]) => Complex;

function problemOf(unknowns: number, residuals: readonly Residual[]): LeastSquaresProblem {
  return {
    unknowns,
    residuals: residuals.length,
    evaluateInto: (x, out, jacobian) => {
      const plain = Array.from(x, (value) => new Complex(value, 0));
      residuals.forEach((residual, i) => {
        out[i] = residual(plain).re;
        if (jacobian === null) return;
        for (let k = 0; k < unknowns; k++) {
          const stepped = plain.map((value, at) => (at === k ? new Complex(value.re, STEP) : value));
          jacobian[i * unknowns + k] = residual(stepped).im / STEP;
        }
      });
    },
  };
}

const ONE = new Complex(1, 0);
const poly = (b: readonly Complex[], x: number): Complex =>
  b.reduceRight((sum, c) => sum.mul(x).add(c), new Complex(0, 0));
const rational = (b: readonly Complex[], x: number): Complex =>
  poly(b.slice(0, 4), x).div(poly([ONE, ...b.slice(4)], x));
const bell = (height: Complex, centre: Complex, width: Complex, x: number): Complex => {
  const offset = centre.neg().add(x).div(width);
  return height.mul(offset.mul(offset).neg().exp());
};
const power = (base: Complex, exponent: Complex): Complex => base.log().mul(exponent).exp();

/** The models as printed with the data sets. */
const MODELS: Readonly<Record<string, (b: readonly Complex[], row: readonly number[]) => Complex>> = {
  Bennett5: ([b1, b2, b3], [, x]) => b1!.mul(power(b2!.add(x!), b3!.inverse().neg())),
  Chwirut1: ([b1, b2, b3], [, x]) => b1!.mul(-x!).exp().div(b3!.mul(x!).add(b2!)),
  DanWood: ([b1, b2], [, x]) => b1!.mul(power(new Complex(x!, 0), b2!)),
  Eckerle4: ([b1, b2, b3], [, x]) => {
    const offset = b3!.neg().add(x!).div(b2!);
    return b1!.div(b2!).mul(offset.mul(offset).mul(-0.5).exp());
  },
  Gauss2: ([b1, b2, b3, b4, b5, b6, b7, b8], [, x]) =>
    b1!
      .mul(b2!.mul(-x!).exp())
      .add(bell(b3!, b4!, b5!, x!))
      .add(bell(b6!, b7!, b8!, x!)),
  Hahn1: (b, [, x]) => rational(b, x!),
  Lanczos1: (b, [, x]) =>
    [0, 2, 4].reduce((sum, k) => sum.add(b[k]!.mul(b[k + 1]!.mul(-x!).exp())), new Complex(0, 0)),
  Lanczos3: (b, [, x]) =>
    [0, 2, 4].reduce((sum, k) => sum.add(b[k]!.mul(b[k + 1]!.mul(-x!).exp())), new Complex(0, 0)),
  MGH10: ([b1, b2, b3], [, x]) => b1!.mul(b2!.div(b3!.add(x!)).exp()),
  Misra1a: ([b1, b2], [, x]) => b1!.mul(ONE.sub(b2!.mul(-x!).exp())),
  Misra1c: ([b1, b2], [, x]) => b1!.mul(ONE.sub(power(b2!.mul(2 * x!).add(1), new Complex(-0.5, 0)))),
  Nelson: ([b1, b2, b3], [, x1, x2]) => b1!.sub(b2!.mul(x1!).mul(b3!.mul(-x2!).exp())),
  Rat43: ([b1, b2, b3, b4], [, x]) => b1!.mul(power(b2!.sub(b3!.mul(x!)).exp().add(1), b4!.inverse().neg())),
  Thurber: (b, [, x]) => rational(b, x!),
};

/** Certified to eleven digits; the data's own conditioning leaves six in the parameters (tolerance of the data set file). */
const PARAMETER = 1e-6;
const SUM_OF_SQUARES = 1e-8;

describe('Levenberg-Marquardt on the certified regressions of NIST StRD', () => {
  // Source: NIST/ITL Statistical Reference Datasets, Nonlinear Regression (itl.nist.gov/div898/strd/nls).
  for (const set of read<Dataset>('optimise-nist-strd.json')) {
    const name = set.id.replace('nist.', '');
    set.starts.forEach((start, index) => {
      it(`${name} from start ${index + 1}: certified parameters and sum of squares [published]`, () => {
        const observed = (row: readonly number[]): number =>
          name === 'Nelson' ? Math.log(row[0]!) : row[0]!;
        const residuals = set.data.map(
          (row): Residual =>
            (b) =>
              MODELS[name]!(b, row).sub(observed(row)),
        );
        const { x, sumOfSquares } = minimiseLeastSquares(
          problemOf(start.length, residuals),
          Float64Array.from(start),
        );
        set.certified.b.forEach((certified, k) => {
          expect(Math.abs(x[k]! / certified - 1)).toBeLessThan(PARAMETER);
        });
        // Lanczos1 fits to the last digit: its certified 1.4e-25 is rounding of the data and no target.
        if (name !== 'Lanczos1')
          expect(Math.abs(sumOfSquares / set.certified.rss - 1)).toBeLessThan(SUM_OF_SQUARES);
      });
    });
  }
});

interface Published {
  readonly id: string;
  readonly x0: readonly number[];
  readonly x_star: readonly number[] | null;
  readonly f_star: number;
  readonly tolerance: { readonly f_abs: number };
}

const times = (count: number): number[] => Array.from({ length: count }, (_, k) => k + 1);

/** J. J. Moré, B. S. Garbow, K. E. Hillstrom, ACM TOMS 7, 17 (1981), by problem number. */
const FUNCTIONS: Readonly<Record<string, readonly Residual[]>> = {
  'mgh.rosenbrock': [([x, y]) => y!.sub(x!.mul(x!)).mul(10), ([x]) => ONE.sub(x!)],
  'mgh.powell_badly_scaled': [
    ([x, y]) => x!.mul(y!).mul(1e4).sub(1),
    ([x, y]) => x!.neg().exp().add(y!.neg().exp()).sub(1.0001),
  ],
  'mgh.box3d_m=10': times(10).map(
    (i): Residual =>
      ([x, y, z]) =>
        x!
          .mul(-i / 10)
          .exp()
          .sub(y!.mul(-i / 10).exp())
          .sub(z!.mul(Math.exp(-i / 10) - Math.exp(-i))),
  ),
  'mgh.brown_dennis_m=20': times(20).map((i): Residual => {
    const t = i / 5;
    return ([a, b, c, d]) => {
      const first = b!.mul(t).add(a!).sub(Math.exp(t));
      const second = d!.mul(Math.sin(t)).add(c!).sub(Math.cos(t));
      return first.mul(first).add(second.mul(second));
    };
  }),
  'mgh.wood': [
    ([a, b]) => b!.sub(a!.mul(a!)).mul(10),
    ([a]) => ONE.sub(a!),
    ([, , c, d]) => d!.sub(c!.mul(c!)).mul(Math.sqrt(90)),
    ([, , c]) => ONE.sub(c!),
    ([, b, , d]) => b!.add(d!).sub(2).mul(Math.sqrt(10)),
    ([, b, , d]) => b!.sub(d!).div(Math.sqrt(10)),
  ],
};

function watson(n: number): Residual[] {
  const rows = times(29).map((i): Residual => {
    const t = i / 29;
    return (x) => {
      let slope = new Complex(0, 0);
      let value = new Complex(0, 0);
      for (let j = 0; j < n; j++) {
        value = value.add(x[j]!.mul(t ** j));
        if (j > 0) slope = slope.add(x[j]!.mul(j * t ** (j - 1)));
      }
      return slope.sub(value.mul(value)).sub(1);
    };
  });
  return [...rows, ([x]) => x!, ([x, y]) => y!.sub(x!.mul(x!)).sub(1)];
}

describe('Levenberg-Marquardt on published test functions', () => {
  const all: Readonly<Record<string, readonly Residual[]>> = {
    ...FUNCTIONS,
    'mgh.watson_n=6': watson(6),
    'mgh.watson_n=12': watson(12),
  };
  for (const entry of read<Published>('optimise-functions.json').filter(({ id }) => id in all)) {
    it(`${entry.id}: the published minimum [published]`, () => {
      const problem = problemOf(entry.x0.length, all[entry.id]!);
      const { sumOfSquares, trace } = minimiseLeastSquares(problem, Float64Array.from(entry.x0));
      expect(Math.abs(sumOfSquares - entry.f_star)).toBeLessThan(entry.tolerance.f_abs);
      for (let k = 1; k < trace.length; k++) expect(trace[k]!).toBeLessThanOrEqual(trace[k - 1]!);
    });
  }
});

describe('what least squares refuses', () => {
  const linear = problemOf(2, [
    ([x, y]) => x!.add(y!),
    ([x, y]) => x!.add(y!).sub(1),
    ([x, y]) => x!.add(y!).sub(2),
  ]);

  it('a rank-deficient Jacobian is stepped through: mean of the data, no NaN [property]', () => {
    const { x, sumOfSquares } = minimiseLeastSquares(linear, Float64Array.of(3, -1));
    expect(x[0]! + x[1]!).toBeCloseTo(1, 9);
    expect(sumOfSquares).toBeCloseTo(2, 9);
  });

  it('a start without a finite residual, and an evaluation budget used up, are NoConvergence [property]', () => {
    expect(() => minimiseLeastSquares(linear, Float64Array.of(Number.NaN, 0))).toThrow(NoConvergence);
    const rosenbrock = problemOf(2, FUNCTIONS['mgh.rosenbrock']!);
    expect(() =>
      minimiseLeastSquares(rosenbrock, Float64Array.of(-1.2, 1), { maximumEvaluations: 3 }),
    ).toThrow(NoConvergence);
  });

  it('fewer residuals than unknowns is a RangeError [property]', () => {
    expect(() => minimiseLeastSquares(problemOf(2, [([x]) => x!]), Float64Array.of(0, 0))).toThrow(
      RangeError,
    );
  });
});
