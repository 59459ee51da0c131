/** Filters designed by SciPy (calls in test/reference/chip-filters.json), split for two arms. */
import { readFileSync } from 'node:fs';
import { Complex } from 'complex.js';
import type { ComplexSeries } from '../../src/circuit/index.ts';
import { OMEGAS } from './fields.ts';

type Pair = readonly [number, number];
interface Stored {
  readonly designs: Readonly<
    Record<
      string,
      {
        readonly zpk: {
          readonly zeros: readonly Pair[];
          readonly poles: readonly Pair[];
          readonly gain: number;
        };
      }
    >
  >;
}

const stored = JSON.parse(
  readFileSync(new URL('../reference/chip-filters.json', import.meta.url), 'utf8'),
) as Stored;

const complex = ([re, im]: Pair) => new Complex(re, im);

/** H(z/a) at z = e^(jΩ), a in (0, 1]: factors of the stored zeros and poles. */
function respond(zpk: Stored['designs'][string]['zpk'], a: number, omegas: Float64Array): ComplexSeries {
  const re = new Float64Array(omegas.length);
  const im = new Float64Array(omegas.length);
  omegas.forEach((omega, k) => {
    const z = new Complex(Math.cos(omega) / a, Math.sin(omega) / a);
    let field = new Complex(zpk.gain, 0);
    for (const zero of zpk.zeros) field = field.mul(z.sub(complex(zero)));
    for (const pole of zpk.poles) field = field.div(z.sub(complex(pole)));
    re[k] = field.re;
    im[k] = field.im;
  });
  return { re, im };
}

/** Low-pass poles of these families lie on the circle in the order of their prototype's: labels by angle, alternately. */
export function labelledFilter(name: string) {
  const { zpk } = stored.designs[name]!;
  const poles = zpk.poles.map(complex).sort((p, q) => Math.atan2(p.im, p.re) - Math.atan2(q.im, q.re));
  return {
    zeros: zpk.zeros.map(complex),
    poles,
    gain: new Complex(zpk.gain, 0),
    arms: poles.map((_, k) => (k % 2) as 0 | 1),
    response: (a = 1, omegas = OMEGAS) => respond(zpk, a, omegas),
  };
}
