import type { Complex } from 'complex.js';

/**
 * A digital filter in factored form: H(z) = gain · Π(z − zeros) / Π(z − poles). As many zeros as poles (those of the
 * prototype at infinity are at z = −1 before rotation). Expanded polynomials lose all digits on narrow bands and are
 * not used anywhere.
 */
export interface TransferFunction {
  readonly zeros: readonly Complex[];
  readonly poles: readonly Complex[];
  readonly gain: Complex;
}

/**
 * A filter of a classical family with, for every pole, the all-pass arm it belongs to: sort the *analog prototype's*
 * poles by s-plane angle, label alternately, carry the label through every transform and rotation. Never sort z poles.
 */
export interface LabelledFilter extends TransferFunction {
  readonly arms: readonly (0 | 1)[];
}

/** One first- or second-order factor of a cascade. `peakDb`: greatest transmission over the FSR. */
export interface FilterSection extends TransferFunction {
  readonly peakDb: number;
}
