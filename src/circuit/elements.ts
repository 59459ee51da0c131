/**
 * The elements of a circuit as closed forms that keep their digits (conventions in src/conventions.ts).
 *
 * A ring behind a coupler of amplitude g with round-trip amplitude a is g(t − g·x)/(1 − g·t·x), x = a·e^(−jd),
 * d = δ·Ω + φ (C. K. Madsen & J. H. Zhao, Optical Filter Design and Analysis, Wiley 1999, ch. 3, with the coupler's own
 * loss on both of its outputs). With A = g·a and half the angle taken out of numerator and denominator:
 *
 *   g · [(t − A)·cos(d/2) + j(t + A)·sin(d/2)] / [(1 − tA)·cos(d/2) + j(1 + tA)·sin(d/2)]
 *
 * where t − A and 1 − tA come from q = 1 − t = K/(1 + t) and α = 1 − A without a subtraction of near-equal numbers, so a
 * narrow ring keeps its relative accuracy on its own resonance. Without loss the numerator is minus the conjugate of the
 * denominator, and the ring is all-pass to the last bit.
 */

const NEPER_PER_DB = Math.LN10 / 20;

/** Field amplitude of a loss in dB (power). */
export function amplitudeOf(lossDb: number): number {
  return Math.exp(-NEPER_PER_DB * lossDb);
}

/** 1 − amplitude of a loss in dB (power), accurate for small losses. */
function amplitudeDeficitOf(lossDb: number): number {
  return -Math.expm1(-NEPER_PER_DB * lossDb);
}

/** Places in the array that `ringConstantsInto` fills. The first six are what the block routines read. */
export const RING_CONSTANT = {
  numeratorCos: 0,
  numeratorSin: 1,
  denominatorCos: 2,
  denominatorSin: 3,
  cosHalfPhase: 4,
  sinHalfPhase: 5,
  phaseRad: 6,
  delay: 7,
  /** K·A, the numerator of dr/dΩ. */
  slope: 8,
} as const;

export const RING_STRIDE = 9;

/**
 * Constants of one ring, at `out[at …]`.
 * @param coupling K in [0, 1]
 * @param turnLossDb loss of the loop's waveguide per turn, dB
 * @param excessLossDb loss of the coupler on both of its outputs, dB
 */
export function ringConstantsInto(
  out: Float64Array,
  at: number,
  coupling: number,
  phaseRad: number,
  turnLossDb: number,
  excessLossDb: number,
  delay: number,
): void {
  const t = Math.sqrt(1 - coupling);
  const q = coupling / (1 + t);
  const totalLossDb = turnLossDb + excessLossDb;
  const amplitude = amplitudeOf(totalLossDb);
  const deficit = amplitudeDeficitOf(totalLossDb);
  out[at + RING_CONSTANT.numeratorCos] = deficit - q;
  out[at + RING_CONSTANT.numeratorSin] = t + amplitude;
  out[at + RING_CONSTANT.denominatorCos] = q + t * deficit;
  out[at + RING_CONSTANT.denominatorSin] = 1 + t * amplitude;
  out[at + RING_CONSTANT.cosHalfPhase] = Math.cos(phaseRad / 2);
  out[at + RING_CONSTANT.sinHalfPhase] = Math.sin(phaseRad / 2);
  out[at + RING_CONSTANT.phaseRad] = phaseRad;
  out[at + RING_CONSTANT.delay] = delay;
  out[at + RING_CONSTANT.slope] = coupling * amplitude;
}
