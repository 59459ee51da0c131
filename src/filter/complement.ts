/**
 * The power complement of a classical filter in factored form: G with |G|² = 1 − |H|², which falls on the other output
 * of the all-pass pair. Its zeros are H's reflection zeros, where H has its peak 1; all lie on the unit circle.
 *
 * Source of the reflection zeros of the prototypes (edge at 1 rad/s): S. J. Orfanidis, "Lecture Notes on Elliptic
 * Filter Design", 2006, sections 2 and 3: Butterworth and Chebyshev II w = 0, N-fold; Chebyshev I w = cos θ_i; elliptic
 * w = cd(u_i·K, k), u_i = (2i − 1)/N.
 */
import { Complex } from 'complex.js';
import { decompose } from './allpass.ts';
import { type BandAsk, rotateFilter } from './bands.ts';
import { prewarp, unwarp } from './bilinear.ts';
import { jacobiCd, landenSequence, selectivityModulus } from './elliptic.ts';
import { discriminationOf } from './families.ts';
import type { LabelledFilter, TransferFunction } from './transfer-function.ts';

/** Frequencies w of the prototype's reflection zeros, edge at 1 rad/s, one for every order. */
function reflectionZeros({ family, order, rippleDb, rejectionDb }: BandAsk): number[] {
  const u = Array.from({ length: order }, (_, index) => (2 * index + 1) / order);
  const isMiddle = (index: number): boolean => 2 * index + 1 === order;
  switch (family) {
    case 'BUTTERWORTH':
    case 'CHEBYSHEV_II':
      return u.map(() => 0);
    case 'CHEBYSHEV_I':
      return u.map((share, index) => (isMiddle(index) ? 0 : Math.cos((share * Math.PI) / 2)));
    case 'ELLIPTIC': {
      const sequence = landenSequence(selectivityModulus(order, discriminationOf(rippleDb!, rejectionDb!)));
      return u.map((share, index) => (isMiddle(index) ? 0 : jacobiCd(new Complex(share, 0), sequence).re));
    }
  }
}

/**
 * Complement of the low-pass `designLowPass(ask)` rotated to `centreRad`, given as `filter`; its phase is that of the
 * other output of the pair whose constants `decompose` gives. O(order).
 */
export function complementOf(ask: BandAsk, filter: LabelledFilter, centreRad: number): TransferFunction {
  const edge = prewarp(ask.edgeRad);
  const zeros = reflectionZeros(ask).map((w) => onCircle(unwarp(w * edge) + centreRad));
  return normalised(zeros, filter);
}

/** Complement of a power-symmetric half-band filter: the same filter half an FSR on. */
export function complementOfHalfBand(filter: LabelledFilter): TransferFunction {
  return normalised(rotateFilter(filter, Math.PI).zeros, filter);
}

/** Zeros over the filter's own poles, scaled so that the complement has field ½(c₀A₀ − c₁A₁) at one of the filter's nulls. */
function normalised(zeros: readonly Complex[], filter: LabelledFilter): TransferFunction {
  const { arms, constants } = decompose(filter);
  const z = filter.zeros[0]!;
  const field = armField(arms[0], z).mul(constants[0]).sub(armField(arms[1], z).mul(constants[1])).mul(0.5);
  let gain = field;
  for (const zero of zeros) gain = gain.div(z.sub(zero));
  for (const pole of filter.poles) gain = gain.mul(z.sub(pole));
  return { zeros, poles: filter.poles, gain };
}

function armField(poles: readonly Complex[], z: Complex): Complex {
  const back = z.inverse();
  return poles.reduce(
    (field, pole) => field.mul(back.sub(pole.conjugate())).div(new Complex(1, 0).sub(back.mul(pole))),
    new Complex(1, 0),
  );
}

const onCircle = (angleRad: number): Complex => new Complex(Math.cos(angleRad), Math.sin(angleRad));
