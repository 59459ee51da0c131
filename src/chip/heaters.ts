/**
 * Heaters: phases from electrical powers through thermal crosstalk,
 *   phase_i = phaseAtZeroRad_i + phasePerMw_i · Σ_j crosstalk_ij · power_j.
 * Phases hold at the reference frequency; they are used as they are over the whole FSR (0.05 % of change in 100 GHz at 193 THz).
 */
import type { ChipModel } from './model.ts';

/** ∂phase_i/∂power_j in rad/mW. */
export function phaseGain(chip: ChipModel, i: number, j: number): number {
  return chip.channels[i]!.phasePerMw * chip.crosstalk[i * chip.channels.length + j]!;
}

/** Phases of all driven elements in channel order, rad, for powers in mW. Cost O(n²). */
export function phasesFromPowers(chip: ChipModel, powersMw: ArrayLike<number>): Float64Array {
  const phases = new Float64Array(chip.channels.length);
  for (let i = 0; i < phases.length; i++) {
    let sum = chip.channels[i]!.phaseAtZeroRad;
    for (let j = 0; j < phases.length; j++) sum += phaseGain(chip, i, j) * powersMw[j]!;
    phases[i] = sum;
  }
  return phases;
}
