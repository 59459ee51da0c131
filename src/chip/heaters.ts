/**
 * Heaters: phases from electrical powers through thermal crosstalk,
 *   phase_i = phaseAtZeroRad_i + phasePerMw_i · Σ_j crosstalk_ij · power_j.
 * The one place where a heater's phase is made: its scaling with ν/ν₀ away from the reference frequency enters here.
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
