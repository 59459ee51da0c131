/**
 * The one-coupler ring as a lossless all-pass factor, and back: pole p = t·e^(−jφ) ⇔ K = 1−|p|², φ = −arg p.
 * Source: C. K. Madsen and J. H. Zhao, "Optical Filter Design and Analysis" (Wiley, 1999), section 3.3 (from memory).
 */
import { Complex } from 'complex.js';
import type { RingParameters } from '../circuit/index.ts';
import { Refusal } from '../errors.ts';
import type { OutputPort } from '../filter/index.ts';

const TURN = 2 * Math.PI;

/** The same phase in (−π, π]. */
export function wrapPhase(phaseRad: number): number {
  const wrapped = phaseRad - TURN * Math.round(phaseRad / TURN);
  return wrapped <= -Math.PI ? wrapped + TURN : wrapped;
}

/** e^(jΩ). */
export function onCircle(omegaRad: number): Complex {
  return new Complex(Math.cos(omegaRad), Math.sin(omegaRad));
}

/**
 * The lossless unit-delay ring of a pole inside the unit circle. A pole at 0 is a ring with K = 1, which is −z⁻¹.
 * Throws a Refusal for a pole on or outside the circle: no passive ring has it.
 */
export function ringOfPole(pole: Complex): RingParameters {
  const powerCrossCoupling = 1 - (pole.re * pole.re + pole.im * pole.im);
  if (!(powerCrossCoupling > 0))
    throw new Refusal({
      code: 'SPECIFICATION_UNREACHABLE',
      limit: 'PASSIVITY',
      detail: `A pole of radius ${pole.abs()} is not inside the unit circle; no passive ring realises it.`,
    });
  const phaseRad = pole.re === 0 && pole.im === 0 ? 0 : -Math.atan2(pole.im, pole.re);
  return { powerCrossCoupling, phaseRad, lossDb: 0, delay: 1 };
}

/**
 * Field of a lossless unit-delay ring at Ω: (u−q)/(q+t·u), u = 2j·sin(d/2)·e^(−jd/2) = 1−e^(−jd), d = Ω+φ, q = K/(1+t) = 1−t.
 * Exact to a few ulp however narrow the ring, which (t−x)/(1−tx) is not.
 */
function ringField(ring: RingParameters, omegaRad: number): Complex {
  const t = Math.sqrt(1 - ring.powerCrossCoupling);
  const q = ring.powerCrossCoupling / (1 + t);
  const half = wrapPhase(omegaRad + ring.phaseRad) / 2;
  const sine = Math.sin(half);
  const re = 2 * sine * sine;
  const im = 2 * sine * Math.cos(half);
  const numerator = new Complex(re - q, im);
  return numerator.div(new Complex(q + t * re, t * im));
}

/** Product of the fields of lossless rings at Ω. */
function armField(rings: readonly RingParameters[], omegaRad: number): Complex {
  let field = new Complex(1, 0);
  for (const ring of rings) field = field.mul(ringField(ring, omegaRad));
  return field;
}

/** Arm phase that puts a null at Ω on `output`: A₀ = ±A₁·e^(−jψ), upper sign on OUT1. */
export function armPhaseForNull(
  arms: readonly [readonly RingParameters[], readonly RingParameters[]],
  output: OutputPort,
  omegaRad: number,
): number {
  const ratio = armField(arms[0], omegaRad).div(armField(arms[1], omegaRad));
  const sign = output === 'OUT1' ? 1 : -1;
  return wrapPhase(-Math.atan2(sign * ratio.im, sign * ratio.re));
}
