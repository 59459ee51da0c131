/**
 * Ring-loaded interferometer: a classical filter as half the sum or difference of two all-pass arms, exactly.
 *
 * Sources: P. P. Vaidyanathan, S. K. Mitra, Y. Neuvo, "A new approach to the realization of low-sensitivity IIR digital
 * filters", IEEE Trans. ASSP 34, 350 (1986) (odd order, real arms); P. P. Vaidyanathan, P. A. Regalia, S. K. Mitra,
 * "Design of doubly complementary IIR digital filters using a single complex allpass filter", IEEE Trans. CAS 34, 378
 * (1987) (even order, complex arms); in optics C. K. Madsen, "Efficient architectures for exactly realizing optical
 * filters with optimum bandpass designs", IEEE Photon. Technol. Lett. 10, 1136 (1998).
 *
 * The split into arms is `decompose` of the filter core, H = ½(c₀A₀ + c₁A₁) with A = Π (z⁻¹ − p*)/(1 − p·z⁻¹). One such
 * factor is −e^(jφ) times the ring of that pole, so every ring leaves π + φ to its arm's constant.
 */
import type { Complex } from 'complex.js';
import type { InterferometerParameters, RingParameters } from '../circuit/index.ts';
import { Refusal } from '../errors.ts';
import { decompose, type LabelledFilter, type OutputPort } from '../filter/index.ts';
import { balancedInterferometer } from './interferometer.ts';
import { ringOfPole, wrapPhase } from './ring.ts';

/** Largest field error that still counts as the same filter; a filter that does not split misses by far more. */
const SPLITS = 1e-6;

export interface RealisedPair {
  /** Lossless, K_in = K_out = 0.5, plain arms without delay, unit-delay rings, arm phase on arm 1. */
  readonly interferometer: InterferometerParameters;
  readonly output: OutputPort;
  /** The field at `output` is e^(j·constantPhaseRad)·z^(−wholeDelay)·H. */
  readonly constantPhaseRad: number;
  /** 0: sum and difference of the arms have as many zeros as poles, as the filter has. */
  readonly wholeDelay: 0;
  /** Largest field error over the FSR, dense where the poles are. */
  readonly fieldError: number;
}

function doesNotSplit(why: string): Refusal {
  return new Refusal({
    code: 'SPECIFICATION_UNREACHABLE',
    limit: 'PASSIVITY',
    detail: `The filter is not half the sum of two all-pass arms: ${why}.`,
  });
}

/** Phase that an arm's constant and its rings add up to. */
const phaseOfArm = (constant: Complex, rings: readonly RingParameters[]): number =>
  rings.reduce((sum, ring) => sum + Math.PI + ring.phaseRad, constant.arg());

/**
 * The lossless interferometer whose field at `output` is H up to a constant phase; the other output carries the power
 * complement. Poles go to the arms that their labels name.
 *
 * Order 1 and up, real or rotated (complex) H. A pole at 0 becomes a ring with K = 1, which is −z⁻¹. Throws a Refusal
 * for a pole on or outside the circle and for a filter that its labels do not split. Cost O(N²).
 */
export function synthesiseAllPassPair(filter: LabelledFilter, output: OutputPort): RealisedPair {
  const order = filter.poles.length;
  if (order === 0 || filter.arms.length !== order || filter.zeros.length !== order)
    throw doesNotSplit('poles, zeros and arm labels differ in number, or there are none');
  const rings = filter.poles.map(ringOfPole);
  const split = decompose(filter);
  if (!(split.residual < SPLITS))
    throw doesNotSplit(`its labelled arms miss it by ${split.residual.toExponential(1)}`);
  const upper = rings.filter((_, k) => filter.arms[k] === 0);
  const lower = rings.filter((_, k) => filter.arms[k] === 1);
  const upperPhase = phaseOfArm(split.constants[0], upper);
  const lowerPhase = phaseOfArm(split.constants[1], lower);
  const crossed = output === 'OUT2';
  return {
    interferometer: balancedInterferometer(
      [upper, lower],
      wrapPhase(upperPhase - lowerPhase + (crossed ? 0 : Math.PI)),
    ),
    output,
    constantPhaseRad: wrapPhase(-upperPhase - (crossed ? Math.PI / 2 : 0)),
    wholeDelay: 0,
    fieldError: split.residual,
  };
}
