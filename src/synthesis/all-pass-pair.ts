/**
 * Ring-loaded interferometer: a classical filter as half the sum or difference of two all-pass arms, exactly.
 *
 * Sources: P. P. Vaidyanathan, S. K. Mitra, Y. Neuvo, "A new approach to the realization of low-sensitivity IIR digital
 * filters", IEEE Trans. ASSP 34, 350 (1986) (odd order, real arms); P. P. Vaidyanathan, P. A. Regalia, S. K. Mitra,
 * "Design of doubly complementary IIR digital filters using a single complex allpass filter", IEEE Trans. CAS 34, 378
 * (1987) (even order, complex arms); in optics C. K. Madsen, "Efficient architectures for exactly realizing optical
 * filters with optimum bandpass designs", IEEE Photon. Technol. Lett. 10, 1136 (1998).
 */
import { Complex } from 'complex.js';
import type { InterferometerParameters, RingParameters } from '../circuit/circuit.ts';
import { Refusal } from '../errors.ts';
import type { OutputPort } from '../filter/specification.ts';
import type { LabelledFilter, TransferFunction } from '../filter/transfer-function.ts';
import { armField, onCircle, ringGroupDelay, ringOfPole, wrapPhase } from './ring.ts';

/** A zero further than this from the unit circle cannot be a null of two equal arms. */
const ON_CIRCLE = 1e-6;

/** Largest field error that still counts as the same filter; a filter that does not split misses by far more. */
const SPLITS = 1e-6;

export interface AllPassPair {
  /** Lossless, K_in = K_out = 0.5, plain arms without delay, unit-delay rings, arm phase on arm 1. */
  readonly interferometer: InterferometerParameters;
  readonly output: OutputPort;
  /** The field at `output` is e^(j·constantPhaseRad)·z^(−wholeDelay)·H. */
  readonly constantPhaseRad: number;
  /** 0: sum and difference of the arms have as many zeros as poles, as the filter has. */
  readonly wholeDelay: 0;
  /** Largest field error at the angles of all poles and zeros. */
  readonly fieldError: number;
}

/** H at e^(jΩ), factors taken zero by pole so that nothing overflows. */
export function fieldOf(filter: TransferFunction, omegaRad: number): Complex {
  const z = onCircle(omegaRad);
  let field = filter.gain;
  const factors = Math.max(filter.zeros.length, filter.poles.length);
  for (let k = 0; k < factors; k++) {
    const zero = filter.zeros[k];
    const pole = filter.poles[k];
    if (zero) field = field.mul(z.sub(zero));
    if (pole) field = field.div(z.sub(pole));
  }
  return field;
}

/** Field at `output` of two lossless arms between equal 0.5 couplers. */
export function pairField(
  arms: readonly [readonly RingParameters[], readonly RingParameters[]],
  armPhaseRad: number,
  output: OutputPort,
  omegaRad: number,
): Complex {
  const upper = armField(arms[0], omegaRad);
  const lower = armField(arms[1], omegaRad).mul(onCircle(-armPhaseRad));
  return output === 'OUT1' ? upper.sub(lower).mul(0.5) : upper.add(lower).mul(new Complex(0, -0.5));
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

/** An interferometer with 0.5 couplers and the given lossless arms. */
export function balancedInterferometer(
  arms: readonly [readonly RingParameters[], readonly RingParameters[]],
  armPhaseRad: number,
): InterferometerParameters {
  return {
    inputCoupling: 0.5,
    outputCoupling: 0.5,
    arms: [
      { rings: arms[0], delay: 0, phaseRad: 0, lossDb: 0 },
      { rings: arms[1], delay: 0, phaseRad: armPhaseRad, lossDb: 0 },
    ],
    couplerExcessLossDb: 0,
  };
}

const angle = (value: Complex): number => Math.atan2(value.im, value.re);

/** The zero where the arms' phases are least steep: there the arm phase is least sensitive to rounding. */
function calmestNull(filter: LabelledFilter, rings: readonly RingParameters[]): number | undefined {
  let best: number | undefined;
  let leastDelay = Number.POSITIVE_INFINITY;
  for (const zero of filter.zeros) {
    if (Math.abs(zero.abs() - 1) > ON_CIRCLE) continue;
    const omegaRad = angle(zero);
    const delay = rings.reduce((sum, ring) => sum + ringGroupDelay(ring, omegaRad), 0);
    if (delay < leastDelay) {
      leastDelay = delay;
      best = omegaRad;
    }
  }
  return best;
}

function doesNotSplit(why: string): Refusal {
  return new Refusal({
    code: 'SPECIFICATION_UNREACHABLE',
    limit: 'PASSIVITY',
    detail: `The filter is not half the sum of two all-pass arms: ${why}.`,
  });
}

/**
 * The lossless interferometer whose field at `output` is H up to a constant phase; the other output carries the power
 * complement. Poles go to the arms that their labels name; arm phase from the null that is least sensitive to rounding.
 *
 * Order 1 and up, real or complex H. Throws a Refusal for a pole outside the circle, for a filter without a zero on
 * the circle, and for one that its labels do not split. Cost O(N²).
 */
export function synthesiseAllPassPair(filter: LabelledFilter, output: OutputPort): AllPassPair {
  if (filter.arms.length !== filter.poles.length || filter.zeros.length !== filter.poles.length)
    throw doesNotSplit('poles, zeros and arm labels differ in number');
  const arms: [RingParameters[], RingParameters[]] = [[], []];
  const rings = filter.poles.map(ringOfPole);
  rings.forEach((ring, k) => {
    arms[filter.arms[k]!].push(ring);
  });
  const null0 = calmestNull(filter, rings);
  if (null0 === undefined) throw doesNotSplit('it has no zero on the unit circle');
  const armPhaseRad = armPhaseForNull(arms, output, null0);

  const samples = [...filter.poles, ...filter.zeros].map(angle);
  const reached = samples.map((omega) => pairField(arms, armPhaseRad, output, omega));
  const wanted = samples.map((omega) => fieldOf(filter, omega));
  let alignment = new Complex(0, 0);
  reached.forEach((field, k) => {
    alignment = alignment.add(field.mul(wanted[k]!.conjugate()));
  });
  const constantPhaseRad = angle(alignment);
  const turn = onCircle(constantPhaseRad);
  const fieldError = reached.reduce(
    (worst, field, k) => Math.max(worst, field.sub(wanted[k]!.mul(turn)).abs()),
    0,
  );
  if (!(fieldError < SPLITS))
    throw doesNotSplit(`its labelled arms miss it by ${fieldError.toExponential(1)}`);
  return {
    interferometer: balancedInterferometer(arms, armPhaseRad),
    output,
    constantPhaseRad,
    wholeDelay: 0,
    fieldError,
  };
}
