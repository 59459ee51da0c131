/**
 * Analog low-pass prototypes of the four classical families in zeros, poles and gain.
 *
 * Sources: T. W. Parks and C. S. Burrus, "Digital Filter Design", Wiley 1987, chapter 7 (Butterworth, Chebyshev I and
 * II); S. J. Orfanidis, "Lecture Notes on Elliptic Filter Design", 2006 (elliptic).
 *
 * The prototype's edge is at 1 rad/s: −3.0103 dB for Butterworth, the ripple edge for Chebyshev I and elliptic, the
 * stopband edge for Chebyshev II. Poles come sorted by s-plane angle, from near +j through the negative real axis to
 * near −j, and are labelled alternately with the all-pass arm they belong to. That is the only place where labels are
 * made: z-plane poles of narrow or mirrored bands have no such order any more.
 */
import { Complex } from 'complex.js';
import {
  inverseSnImaginary,
  jacobiCd,
  landenSequence,
  type Modulus,
  selectivityModulus,
} from './elliptic.ts';
import { rippleFactor } from './ripple-factor.ts';
import type { Family } from './specification.ts';

/** H(s) = gain · Π(s − zeros) / Π(s − poles); zeros at infinity are left out. Peak transmission is 1. */
export interface AnalogFilter {
  readonly zeros: readonly Complex[];
  readonly poles: readonly Complex[];
  readonly gain: number;
  /** The all-pass arm of every pole. */
  readonly arms: readonly (0 | 1)[];
}

export interface AnalogPrototype extends AnalogFilter {
  /** Field transmission at s = 0: 1, or the bottom of the ripple for even Chebyshev I and elliptic filters. */
  readonly dcGain: number;
}

/** The figures a family needs: ripple for Chebyshev I and elliptic, rejection for Chebyshev II and elliptic, dB. */
export interface PrototypeAsk {
  readonly family: Family;
  readonly order: number;
  readonly rippleDb?: number;
  readonly rejectionDb?: number;
}

function productOfNegatives(roots: readonly Complex[]): number {
  return roots.reduce((product, root) => product.mul(root.neg()), new Complex(1, 0)).re;
}

function prototype(zeros: Complex[], poles: Complex[], dcGain: number): AnalogPrototype {
  const arms = poles.map((_, index): 0 | 1 => (index % 2 === 0 ? 0 : 1));
  return {
    zeros,
    poles,
    arms,
    dcGain,
    gain: (dcGain * productOfNegatives(poles)) / productOfNegatives(zeros),
  };
}

/** sin and cos of θ = π(2·index + 1)/(2·order), `index` from 0; the middle one, cos θ = 0, exact. */
function angleFromAxis(index: number, order: number): { sin: number; cos: number } {
  const beforeMiddle = (((order - 1 - 2 * index) / order) * Math.PI) / 2;
  return { sin: Math.cos(beforeMiddle), cos: Math.sin(beforeMiddle) };
}

function isMiddle(index: number, order: number): boolean {
  return 2 * index + 1 === order;
}

/** Poles −sinh(v)·sin θ + j·cosh(v)·cos θ of Chebyshev's ellipse, `a` = sinh(v). */
function ellipsePoles(order: number, a: number): Complex[] {
  const b = Math.hypot(1, a);
  return Array.from({ length: order }, (_, index) => {
    const { sin, cos } = angleFromAxis(index, order);
    return new Complex(-a * sin, b * cos);
  });
}

function butterworth(order: number): AnalogPrototype {
  const poles = Array.from({ length: order }, (_, index) => {
    const { sin, cos } = angleFromAxis(index, order);
    return new Complex(-sin, cos);
  });
  return prototype([], poles, 1);
}

const evenDcGain = (order: number, rippleDb: number): number =>
  order % 2 === 0 ? 10 ** (-rippleDb / 20) : 1;

function chebyshevI(order: number, rippleDb: number): AnalogPrototype {
  const a = Math.sinh(Math.asinh(1 / rippleFactor(rippleDb)) / order);
  return prototype([], ellipsePoles(order, a), evenDcGain(order, rippleDb));
}

/** Poles are the inverses of Chebyshev I poles; conjugated, so that they keep their order by angle. */
function chebyshevII(order: number, rejectionDb: number): AnalogPrototype {
  const a = Math.sinh(Math.asinh(rippleFactor(rejectionDb)) / order);
  const poles = ellipsePoles(order, a).map((pole) => pole.div(pole.re * pole.re + pole.im * pole.im));
  const zeros: Complex[] = [];
  for (let index = 0; index < order; index++) {
    if (!isMiddle(index, order)) zeros.push(new Complex(0, 1 / angleFromAxis(index, order).cos));
  }
  return prototype(zeros, poles, 1);
}

/** k₁ = ε_p/ε_s; k₁'² = (ε_s² − ε_p²)/ε_s² without taking 1 − k₁². */
export function discriminationOf(rippleDb: number, rejectionDb: number): Modulus {
  const pass = rippleFactor(rippleDb);
  const stop = rippleFactor(rejectionDb);
  const gap = 10 ** (rippleDb / 20) * rippleFactor(rejectionDb - rippleDb);
  return { k: pass / stop, complement: gap / stop };
}

/**
 * Elliptic low-pass of selectivity modulus k and pole parameter v₀ (in units of K): zeros ±j/(k·cd(u·K)), poles
 * j·cd((u − j·v₀)K), u = (2i − 1)/N, ripple edge at 1 rad/s.
 */
export function ellipticOfModulus(
  order: number,
  modulus: Modulus,
  poleParameter: number,
  dcGain: number,
): AnalogPrototype {
  const sequence = landenSequence(modulus);
  const zeros: Complex[] = [];
  const poles: Complex[] = [];
  for (let index = 0; index < order; index++) {
    const u = (2 * index + 1) / order;
    const cd = jacobiCd(new Complex(u, -poleParameter), sequence);
    poles.push(isMiddle(index, order) ? new Complex(-cd.im, 0) : new Complex(-cd.im, cd.re));
    if (!isMiddle(index, order))
      zeros.push(new Complex(0, 1 / (modulus.k * jacobiCd(new Complex(u, 0), sequence).re)));
  }
  return prototype(zeros, poles, dcGain);
}

function elliptic(order: number, rippleDb: number, rejectionDb: number): AnalogPrototype {
  const discrimination = discriminationOf(rippleDb, rejectionDb);
  const poleParameter = inverseSnImaginary(1 / rippleFactor(rippleDb), discrimination) / order;
  const modulus = selectivityModulus(order, discrimination);
  return ellipticOfModulus(order, modulus, poleParameter, evenDcGain(order, rippleDb));
}

/**
 * The analog low-pass prototype of a family. Order ≥ 1, ripple > 0 dB, rejection > 0 dB (and > ripple for elliptic):
 * guarded by the band designs. Absolute error of poles below 1e-13 to order 16. O(order).
 */
export function analogPrototype({ family, order, rippleDb, rejectionDb }: PrototypeAsk): AnalogPrototype {
  switch (family) {
    case 'BUTTERWORTH':
      return butterworth(order);
    case 'CHEBYSHEV_I':
      return chebyshevI(order, rippleDb!);
    case 'CHEBYSHEV_II':
      return chebyshevII(order, rejectionDb!);
    case 'ELLIPTIC':
      return elliptic(order, rippleDb!, rejectionDb!);
  }
}
