/**
 * Between dB and the factors ε of the low-pass forms |H|² = 1/(1 + ε²F²). expm1 and log1p, because 10^(r/10) − 1
 * taken literally has lost ten digits at a ripple of 1e-6 dB.
 */
const NEPER_PER_DB = Math.LN10 / 10;

/** ε = √(10^(dB/10) − 1) of an attenuation in dB ≥ 0. */
export const rippleFactor = (attenuationDb: number): number =>
  Math.sqrt(Math.expm1(attenuationDb * NEPER_PER_DB));

/** A factor whose square overflows is its own attenuation long before. */
const GREAT_FACTOR = 1e100;

/** The attenuation 10·log₁₀(1 + ε²) in dB that a factor stands for. */
export const attenuationDb = (factor: number): number =>
  (factor < GREAT_FACTOR ? Math.log1p(factor * factor) : 2 * Math.log(factor)) / NEPER_PER_DB;
