/**
 * A classical filter as half the sum of two all-pass arms; half their difference is its power complement.
 *
 * Sources: P. P. Vaidyanathan, S. K. Mitra and Y. Neuvo, "A new approach to the realization of low-sensitivity IIR
 * digital filters", IEEE Trans. ASSP 34, 350 (1986); T. Saramäki, "On the design of digital filters as a sum of two
 * all-pass filters", IEEE Trans. CAS 32, 1123 (1985); optical form: C. K. Madsen, "Efficient architectures for exactly
 * realizing optical filters with optimum bandpass designs", IEEE Photon. Technol. Lett. 10, 1136 (1998).
 *
 * H = ½(c₀·A₀ + c₁·A₁), G = ½(c₀·A₀ − c₁·A₁), A(z) = Π (z⁻¹ − p*)/(1 − p·z⁻¹), |c₀| = |c₁| = 1. Odd orders of
 * real-coefficient filters have real arms, even orders arms conjugate to each other; a rotation changes neither form.
 */
import { Complex } from 'complex.js';
import { evaluateInto } from './evaluate.ts';
import { findPeak } from './peak.ts';
import type { LabelledFilter } from './transfer-function.ts';

export interface AllPassPair {
  /** Poles of arm 0 and of arm 1, in the filter's order. */
  readonly arms: readonly [readonly Complex[], readonly Complex[]];
  /** c₀ and c₁, of modulus 1. */
  readonly constants: readonly [Complex, Complex];
  /** Greatest |H − ½(c₀A₀ + c₁A₁)| found on a grid that is dense where the poles are. */
  readonly residual: number;
}

/**
 * Phase (rad, not wrapped) of Π (z⁻¹ − p*)/(1 − p·z⁻¹) at Ω. A factor is e^{jΩ}·v* / v with v = e^{jΩ} − p, of modulus
 * 1 whatever its rounding, so the arm's phase is order·Ω − 2·arg Πv.
 */
function armPhase(poles: readonly Complex[], omegaRad: number): number {
  const half = Math.sin(omegaRad / 2);
  const uRe = -2 * half * half;
  const uIm = 2 * half * Math.cos(omegaRad / 2);
  let re = 1;
  let im = 0;
  for (const pole of poles) {
    const vRe = 1 - pole.re + uRe;
    const vIm = uIm - pole.im;
    const next = re * vRe - im * vIm;
    im = re * vIm + im * vRe;
    re = next;
  }
  return poles.length * omegaRad - 2 * Math.atan2(im, re);
}

const phasor = (phaseRad: number): Complex => new Complex(Math.cos(phaseRad), Math.sin(phaseRad));

/** Distance from Ω to the nearest pole's angle, rad. */
function distanceToPoles(filter: LabelledFilter, omegaRad: number): number {
  const distances = filter.poles.map((pole) => Math.abs(Math.sin((omegaRad - pole.arg()) / 2)));
  return Math.min(...distances);
}

/** Angle of the filter's null that is farthest from its poles, where the arms turn slowest. */
function quietestNull(filter: LabelledFilter): number {
  let best = Math.PI;
  let distance = -1;
  for (const zero of filter.zeros) {
    const angle = zero.arg();
    const candidate = distanceToPoles(filter, angle);
    if (candidate <= distance) continue;
    distance = candidate;
    best = angle;
  }
  return best;
}

/** Uniform points of the residual's grid; 32 more go around every pole, in steps of its distance to the unit circle. */
const UNIFORM_POINTS = 512;
const POINTS_PER_POLE = 32;

function residualGrid(poles: readonly Complex[]): Float64Array {
  const grid = new Float64Array(UNIFORM_POINTS + POINTS_PER_POLE * poles.length);
  for (let point = 0; point < UNIFORM_POINTS; point++)
    grid[point] = (2 * Math.PI * point) / UNIFORM_POINTS - Math.PI;
  poles.forEach((pole, index) => {
    for (let point = 0; point < POINTS_PER_POLE; point++) {
      const steps = (point - POINTS_PER_POLE / 2) / 4;
      grid[UNIFORM_POINTS + index * POINTS_PER_POLE + point] = pole.arg() + steps * (1 - pole.abs());
    }
  });
  return grid;
}

function residual(
  filter: LabelledFilter,
  arms: AllPassPair['arms'],
  phases: readonly [number, number],
): number {
  const grid = residualGrid(filter.poles);
  const re = new Float64Array(grid.length);
  const im = new Float64Array(grid.length);
  evaluateInto(filter, grid, re, im);
  let worst = 0;
  for (let point = 0; point < grid.length; point++) {
    const first = phases[0] + armPhase(arms[0], grid[point]!);
    const second = phases[1] + armPhase(arms[1], grid[point]!);
    const dRe = re[point]! - 0.5 * (Math.cos(first) + Math.cos(second));
    const dIm = im[point]! - 0.5 * (Math.sin(first) + Math.sin(second));
    worst = Math.max(worst, Math.hypot(dRe, dIm));
  }
  return worst;
}

/**
 * Splits a filter by its labels. At a null of H the arms cancel, which gives c₁/c₀ without solving anything; the
 * peak then gives c₀. Whoever builds on the pair looks at `residual`: about 1e-14 · order, more (1e-16 / (1 − |p|))
 * for poles very near the unit circle, and of the order of 1 when the labels are wrong. O(order · (512 + 32·order)).
 */
export function decompose(filter: LabelledFilter): AllPassPair {
  const arms = [0, 1].map((arm) => filter.poles.filter((_, index) => filter.arms[index] === arm));
  const pair = [arms[0]!, arms[1]!] as const;
  const dark = quietestNull(filter);
  const difference = Math.PI + armPhase(pair[0], dark) - armPhase(pair[1], dark);
  const bright = findPeak(filter).omegaRad;
  const re = new Float64Array(1);
  const im = new Float64Array(1);
  evaluateInto(filter, new Float64Array([bright]), re, im);
  const first = phasor(armPhase(pair[0], bright));
  const second = phasor(difference + armPhase(pair[1], bright));
  const common = new Complex(re[0]!, im[0]!).div(first.add(second)).arg();
  const constants = [phasor(common), phasor(common + difference)] as const;
  return { arms: pair, constants, residual: residual(filter, pair, [common, common + difference]) };
}
