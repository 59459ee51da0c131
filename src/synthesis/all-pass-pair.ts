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
import type { InterferometerParameters, RingParameters } from '../circuit/index.ts';
import { Refusal } from '../errors.ts';
import { evaluateInto, type LabelledFilter, type OutputPort } from '../filter/index.ts';
import { balancedInterferometer } from './interferometer.ts';
import { circleGrid } from './peak.ts';
import { armField, armPhaseForNull, onCircle, ringGroupDelay, ringOfPole } from './ring.ts';

/** A zero further than this from the unit circle cannot be a null of two equal arms. */
const ON_CIRCLE = 1e-6;

/** Points over the FSR on which field and filter are compared, besides those around every pole. */
const COMPARED_POINTS = 64;

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

type Arms = readonly [readonly RingParameters[], readonly RingParameters[]];

/** The null where the arms' phases are least steep: there the arm phase is least sensitive to rounding. */
function calmestNull(filter: LabelledFilter, rings: readonly RingParameters[]): number | undefined {
  let best: number | undefined;
  let leastDelay = Number.POSITIVE_INFINITY;
  for (const zero of filter.zeros) {
    if (Math.abs(zero.abs() - 1) > ON_CIRCLE) continue;
    const omegaRad = zero.arg();
    const delay = rings.reduce((sum, ring) => sum + ringGroupDelay(ring, omegaRad), 0);
    if (delay < leastDelay) {
      leastDelay = delay;
      best = omegaRad;
    }
  }
  return best;
}

/** Field at `output` of two lossless arms between equal 0.5 couplers. */
function pairField(arms: Arms, armPhaseRad: number, output: OutputPort, omegaRad: number): Complex {
  const upper = armField(arms[0], omegaRad);
  const lower = armField(arms[1], omegaRad).mul(onCircle(-armPhaseRad));
  return output === 'OUT1' ? upper.sub(lower).mul(0.5) : upper.add(lower).mul(new Complex(0, -0.5));
}

/** The phase between circuit and filter that leaves the least error (power-weighted), and that error's largest value. */
function compare(
  filter: LabelledFilter,
  field: (omegaRad: number) => Complex,
): { constantPhaseRad: number; fieldError: number } {
  const grid = circleGrid(filter.poles, COMPARED_POINTS);
  const re = new Float64Array(grid.length);
  const im = new Float64Array(grid.length);
  evaluateInto(filter, grid, re, im);
  const reached = Array.from(grid, field);
  const wanted = reached.map((_, k) => new Complex(re[k]!, im[k]!));
  let alignment = new Complex(0, 0);
  for (let k = 0; k < grid.length; k++) alignment = alignment.add(reached[k]!.mul(wanted[k]!.conjugate()));
  const constantPhaseRad = alignment.arg();
  const turn = onCircle(constantPhaseRad);
  const errors = reached.map((value, k) => value.sub(wanted[k]!.mul(turn)).abs());
  return { constantPhaseRad, fieldError: Math.max(...errors) };
}

/**
 * The lossless interferometer whose field at `output` is H up to a constant phase; the other output carries the power
 * complement. Poles go to the arms that their labels name; one null of H gives the arm phase.
 *
 * Order 1 and up, real or rotated (complex) H. A pole at 0 becomes a ring with K = 1, which is −z⁻¹. Throws a Refusal
 * for a pole on or outside the circle, for a filter without a zero on it, and for one that its labels do not split.
 * Cost O(N²).
 */
export function synthesiseAllPassPair(filter: LabelledFilter, output: OutputPort): RealisedPair {
  const order = filter.poles.length;
  if (order === 0 || filter.arms.length !== order || filter.zeros.length !== order)
    throw doesNotSplit('poles, zeros and arm labels differ in number, or there are none');
  const rings = filter.poles.map(ringOfPole);
  const arms: Arms = [
    rings.filter((_, k) => filter.arms[k] === 0),
    rings.filter((_, k) => filter.arms[k] === 1),
  ];
  const nullRad = calmestNull(filter, rings);
  if (nullRad === undefined) throw doesNotSplit('it has no zero on the unit circle');
  const armPhaseRad = armPhaseForNull(arms, output, nullRad);
  const { constantPhaseRad, fieldError } = compare(filter, (omegaRad) =>
    pairField(arms, armPhaseRad, output, omegaRad),
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
