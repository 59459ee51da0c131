/**
 * The tunable coupler: two directional couplers with a heater on one of the two guides between them.
 *
 * With α = asin√κ of the two inner couplers and P = diag(e^(−jθ), 1) (heater on the upper guide) or diag(1, e^(−jθ)),
 * M = C(α₂)·P·C(α₁). Its power cross-coupling is
 *   K(θ) = s₂²c₁² + c₂²s₁² + 2·s₁c₁s₂c₂·cos θ = K_min + (K_max − K_min)·cos²(θ/2),
 *   K_min = sin²(α₁−α₂), K_max = sin²(α₁+α₂),
 * so ±θ give the same K with different phases. Source: the product of the coupler matrices of `conventions.ts`; the form
 * is that of D. A. B. Miller, "Perfect optics with imperfect components", Optica 2, 747 (2015) (from memory).
 *
 * Any such M is diag(e^(−ja), e^(−jb))·[[t, −jκ], [−jκ, t]]·diag(e^(−jc), 1) with t, κ ≥ 0. The phases a, b, c belong to
 * the neighbours: see `fold.ts`.
 */
import { Complex } from 'complex.js';
import type { Coupler } from './model.ts';

/** Below this a matrix entry has no phase of its own: it is rounding left over from a dark or a full coupler. */
const DARK_FIELD = 1e-14;

export interface CouplerState {
  readonly powerCrossCoupling: number;
  /** a: phase after the coupler on guide 1, rad. */
  readonly outPhase1Rad: number;
  /** b: phase after the coupler on guide 2, rad. */
  readonly outPhase2Rad: number;
  /** c: phase before the coupler on guide 1, rad. */
  readonly inPhase1Rad: number;
}

/** Two guides in, two guides out. */
export interface TwoByTwo {
  readonly m11: Complex;
  readonly m12: Complex;
  readonly m21: Complex;
  readonly m22: Complex;
}

/** asin√K, without the asin: near K = 1 that loses half the digits. */
function angleOfCoupling(powerCrossCoupling: number): number {
  return Math.atan2(Math.sqrt(powerCrossCoupling), Math.sqrt(1 - powerCrossCoupling));
}

/** [κ₁, κ₂] of the inner couplers, the stronger first, α₁ + α₂ ≤ π/2: the pair that leaves [minCoupling, maxCoupling]. */
export function innerCouplings(coupler: Coupler): readonly [number, number] {
  const sum = angleOfCoupling(coupler.maxCoupling);
  const difference = angleOfCoupling(coupler.minCoupling);
  return [Math.sin((sum + difference) / 2) ** 2, Math.sin((sum - difference) / 2) ** 2];
}

/** M(θ) of a tunable coupler. Sums that cancel are formed from K_min and K_max, so a dark entry is as exact as θ is. */
function matrixAt(coupler: Coupler, thetaRad: number): TwoByTwo {
  const sum = angleOfCoupling(coupler.maxCoupling);
  const difference = angleOfCoupling(coupler.minCoupling);
  const first = (sum + difference) / 2;
  const second = (sum - difference) / 2;
  const [s1, c1, s2, c2] = [Math.sin(first), Math.cos(first), Math.sin(second), Math.cos(second)];
  const half = thetaRad / 2;
  const turn = new Complex(Math.cos(half), -Math.sin(half));
  const missing = turn.mul(new Complex(0, 2 * Math.sin(half))); // 1 − e^(−jθ)
  const both = turn.mul(2 * Math.cos(half)); // 1 + e^(−jθ)
  const straight = Math.sqrt(1 - coupler.maxCoupling); // cos(α₁+α₂)
  const residue = Math.sqrt(coupler.minCoupling); // sin(α₁−α₂)
  const minusJ = new Complex(0, -1);
  const upper = {
    m11: new Complex(straight).sub(missing.mul(c1 * c2)),
    m12: minusJ.mul(both.mul(c2 * s1).sub(residue)),
    m21: minusJ.mul(both.mul(s2 * c1).add(residue)),
    m22: new Complex(straight).add(missing.mul(s1 * s2)),
  };
  if (coupler.heatedArm === 'UPPER') return upper;
  return {
    m11: upper.m22,
    m12: minusJ.mul(both.mul(c1 * s2).add(residue)),
    m21: minusJ.mul(both.mul(c2 * s1).sub(residue)),
    m22: upper.m11,
  };
}

const angleOf = (value: Complex): number => Math.atan2(value.im, value.re);

/** Phases a, b, c of a lossless M, and its K. Where an entry is dark its phase is free and c is taken as 0. */
export function splitCoupler(m: TwoByTwo): CouplerState {
  const cross = m.m21.abs();
  const bar = m.m11.abs();
  const powerCrossCoupling = cross * cross;
  if (cross < DARK_FIELD)
    return {
      powerCrossCoupling,
      outPhase1Rad: -angleOf(m.m11),
      outPhase2Rad: -angleOf(m.m22),
      inPhase1Rad: 0,
    };
  const outPhase1Rad = -angleOf(m.m12) - Math.PI / 2;
  if (bar < DARK_FIELD)
    return { powerCrossCoupling, outPhase1Rad, outPhase2Rad: -angleOf(m.m21) - Math.PI / 2, inPhase1Rad: 0 };
  return {
    powerCrossCoupling,
    outPhase1Rad,
    outPhase2Rad: -angleOf(m.m22),
    inPhase1Rad: -angleOf(m.m11) - outPhase1Rad,
  };
}

/** What a coupler does at heater phase θ (rad). A fixed coupler adds no phase and ignores θ. */
export function couplerAt(coupler: Coupler, thetaRad: number): CouplerState {
  if (!coupler.tunable)
    return {
      powerCrossCoupling: coupler.powerCrossCoupling ?? coupler.minCoupling,
      outPhase1Rad: 0,
      outPhase2Rad: 0,
      inPhase1Rad: 0,
    };
  const span = coupler.maxCoupling - coupler.minCoupling;
  const powerCrossCoupling = Math.min(1, coupler.minCoupling + span * Math.cos(thetaRad / 2) ** 2);
  return { ...splitCoupler(matrixAt(coupler, thetaRad)), powerCrossCoupling };
}

/**
 * The two heater phases [+θ, −θ] in [−π, π] that give K, clamped to the coupler's reach. Near the ends K is flat in θ:
 * an error ε of K there is an error √ε of θ, and the other way round.
 */
export function thetaForCoupling(coupler: Coupler, powerCrossCoupling: number): readonly [number, number] {
  const above = Math.max(0, powerCrossCoupling - coupler.minCoupling);
  const below = Math.max(0, coupler.maxCoupling - powerCrossCoupling);
  const thetaRad = 2 * Math.atan2(Math.sqrt(below), Math.sqrt(above));
  return [thetaRad, -thetaRad];
}
