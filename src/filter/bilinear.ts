/**
 * The bilinear transformation s = (z − 1)/(z + 1), in zeros, poles and gain: an analog frequency w is the digital
 * Ω = 2·atan(w), so a design edge is prewarped by w = tan(Ω/2) (A. V. Oppenheim and R. W. Schafer, "Discrete-Time
 * Signal Processing", 3rd ed., section 7.2).
 */
import { Complex } from 'complex.js';
import type { AnalogFilter } from './families.ts';
import { guardPoles } from './guards.ts';
import type { LabelledFilter } from './transfer-function.ts';

/** tan(Ω/2). */
export const prewarp = (omegaRad: number): number => Math.tan(omegaRad / 2);

/** 2·atan(w), the inverse of {@link prewarp}. */
export const unwarp = (w: number): number => 2 * Math.atan(w);

function toZ(s: Complex): Complex {
  return s.add(1).div(s.neg().add(1));
}

/** A zero at s = jw: on the unit circle, without a rounding error in its radius that a division would leave. */
function toUnitCircle(w: number): Complex {
  const angle = unwarp(w);
  return new Complex(Math.cos(angle), Math.sin(angle));
}

/**
 * Digital filter of an analog one. Each factor (s − r) becomes (1 − r)(z − z_r)/(z + 1), so the gain is a product of
 * terms without cancellation (poles lie left of 0) and every zero at infinity lands on z = −1. Refuses poles that a
 * double cannot tell from the unit circle.
 */
export function bilinear(filter: AnalogFilter): LabelledFilter {
  let gain = new Complex(filter.gain, 0);
  for (const zero of filter.zeros) gain = gain.mul(zero.neg().add(1));
  for (const pole of filter.poles) gain = gain.div(pole.neg().add(1));
  const zeros = filter.zeros.map((zero) => (zero.re === 0 ? toUnitCircle(zero.im) : toZ(zero)));
  while (zeros.length < filter.poles.length) zeros.push(new Complex(-1, 0));
  const poles = filter.poles.map(toZ);
  guardPoles(poles);
  return { zeros, poles, gain: new Complex(gain.re, 0), arms: filter.arms };
}
