/**
 * Jacobi elliptic functions, complete integrals and the degree equation, for moduli arbitrarily near 0 and 1.
 *
 * A modulus is carried together with its complement, since 1 − k² taken from k near 1 (or k from k' near 1) has no
 * digits left. Sources:
 * - S. J. Orfanidis, "Lecture Notes on Elliptic Filter Design", Rutgers University, 2006: Landen recursions for cd, sn
 *   and their inverses, arguments in units of the quarter period; the degree equation N·K'/K = K₁'/K₁.
 * - NIST Digital Library of Mathematical Functions: 19.8.5 (K by the arithmetic-geometric mean), 22.2.1 (nome),
 *   22.2.2 (moduli by theta functions), 20.2.2-20.2.4 (theta series), 22.7.1-22.7.2 (descending Landen transformation).
 */
import type { Complex } from 'complex.js';
import { NoConvergence } from '../errors.ts';

/** k and k' = √(1 − k²), each to full relative precision. */
export interface Modulus {
  readonly k: number;
  readonly complement: number;
}

/** The modulus with k and k' exchanged. */
const complementary = ({ k, complement }: Modulus): Modulus => ({ k: complement, complement: k });

/** The AGM converges quadratically; from a ratio of 1e-300 it takes 13 steps, then one a doubling of digits. */
const AGM_STEPS = 40;

function agm(a0: number, b0: number): number {
  let a = a0;
  let b = b0;
  for (let step = 0; step < AGM_STEPS; step++) {
    if (Math.abs(a - b) <= 2 * Number.EPSILON * a) return 0.5 * (a + b);
    const next = 0.5 * (a + b);
    b = Math.sqrt(a * b);
    a = next;
  }
  throw new NoConvergence('arithmetic-geometric mean', AGM_STEPS, Math.abs(a - b) / a);
}

/** Complete elliptic integral K(k) = π / (2·agm(1, k')), DLMF 19.8.5. k in [0, 1). */
export const completeIntegral = ({ complement }: Modulus): number => Math.PI / (2 * agm(1, complement));

/** ln q = −π·K'/K, DLMF 22.2.1; the logarithm, because q itself may underflow. */
export function logNome(modulus: Modulus): number {
  return (-Math.PI * agm(1, modulus.complement)) / agm(1, modulus.k);
}

/** At q ≤ exp(−π) the fourth term of each theta series is below 1e-16 of the first. */
const THETA_TERMS = 5;

function modulusOfSmallNome(logQ: number): Modulus {
  let theta2 = 1; // θ₂ / (2·q^¼)
  let theta3 = 1;
  let theta4 = 1;
  for (let n = 1; n < THETA_TERMS; n++) {
    const term = 2 * Math.exp(logQ * n * n);
    theta2 += Math.exp(logQ * n * (n + 1));
    theta3 += term;
    theta4 += n % 2 === 1 ? -term : term;
  }
  const k = 4 * Math.exp(0.5 * logQ) * (theta2 / theta3) ** 2;
  return { k, complement: (theta4 / theta3) ** 2 };
}

/**
 * The modulus whose nome has the logarithm `logQ` < 0: k = θ₂²/θ₃², k' = θ₄²/θ₃² (DLMF 22.2.2). For q > exp(−π) the
 * complementary modulus is found from its own nome, ln q · ln q' = π².
 */
export function modulusOfLogNome(logQ: number): Modulus {
  if (logQ <= -Math.PI) return modulusOfSmallNome(logQ);
  return complementary(modulusOfSmallNome((Math.PI * Math.PI) / logQ));
}

/** Degree equation solved for the selectivity modulus k of an order from its discrimination modulus k₁: ln q = ln q₁ / N. */
export const selectivityModulus = (order: number, discrimination: Modulus): Modulus =>
  modulusOfLogNome(logNome(discrimination) / order);

/** Degree equation solved for the discrimination modulus k₁ of an order from its selectivity modulus k: ln q₁ = N·ln q. */
export const discriminationModulus = (order: number, selectivity: Modulus): Modulus =>
  modulusOfLogNome(logNome(selectivity) * order);

/** k falls quadratically; from k' = 1e-300 it takes 12 steps. */
const LANDEN_STEPS = 40;

/** Descending Landen sequence k₁, k₂, … of DLMF 22.7.1, kₙ = (kₙ₋₁/(1 + k'ₙ₋₁))², until it no longer matters to a double. */
export function landenSequence(modulus: Modulus): readonly number[] {
  const sequence: number[] = [];
  let { k, complement } = modulus;
  while (k > 0.1 * Number.EPSILON) {
    if (sequence.length === LANDEN_STEPS)
      throw new NoConvergence('descending Landen sequence', LANDEN_STEPS, k);
    k = (k / (1 + complement)) ** 2;
    complement = (2 * Math.sqrt(complement)) / (1 + complement);
    sequence.push(k);
  }
  return sequence;
}

/** Climbs the Landen sequence from a trigonometric value: w ← (1 + kₙ)·w / (1 + kₙ·w²), DLMF 22.7.2. */
function climb(start: Complex, sequence: readonly number[]): Complex {
  let w = start;
  for (let n = sequence.length - 1; n >= 0; n--) {
    const k = sequence[n]!;
    w = w.mul(1 + k).div(w.mul(w).mul(k).add(1));
  }
  return w;
}

/** cd(u·K, k) for complex u in units of the quarter period K; `sequence` is the modulus' {@link landenSequence}. */
export const jacobiCd = (u: Complex, sequence: readonly number[]): Complex =>
  climb(u.mul(Math.PI / 2).cos(), sequence);

/** sn(u·K, k) for complex u in units of the quarter period K. */
export const jacobiSn = (u: Complex, sequence: readonly number[]): Complex =>
  climb(u.mul(Math.PI / 2).sin(), sequence);

/**
 * The v ≥ 0 with sn(j·v·K, k) = j·y, y ≥ 0 real, in units of K: Orfanidis' inverse recursion, which stays real on the
 * imaginary axis.
 */
export function inverseSnImaginary(y: number, modulus: Modulus): number {
  let value = y;
  let k = modulus.k;
  for (const next of landenSequence(modulus)) {
    value = (2 * value) / ((1 + next) * (1 + Math.hypot(1, k * value)));
    k = next;
  }
  return (2 / Math.PI) * Math.asinh(value);
}
