/**
 * One chip as the lab knows it, in canonical form (FSR resolved, defaults filled). Made by `schema/` from what a
 * person registers; the core may assume it valid in type, range and references.
 *
 * Element paths, the names a driver channel may `drive`:
 *   <cell>.input.coupling, <cell>.output.coupling, <cell>.ring<k>.coupling, <cell>.ring<k>.phase, <cell>.arm.phase
 * Rings are numbered from 1 through the cell, first those of arm 0 (the upper arm, between out1 of the input coupler
 * and in1 of the output coupler), then those of arm 1. `arm.phase` sits on arm 1.
 */
import type { CellJoin } from '../circuit/circuit.ts';

/** Which guide of a tunable coupler (a balanced two-coupler interferometer) its heater warms. */
export type HeatedArm = 'UPPER' | 'LOWER';

export interface Coupler {
  /** `input`, `output` or `ring<k>` within its cell. */
  readonly element: string;
  readonly tunable: boolean;
  /** Fixed couplers: K. Tunable ones: absent. */
  readonly powerCrossCoupling?: number;
  /** Reach of K; of a tunable coupler [sin²(α₁−α₂), sin²(α₁+α₂)] by its two inner couplers, of a fixed one K itself. */
  readonly minCoupling: number;
  readonly maxCoupling: number;
  readonly heatedArm: HeatedArm;
}

export interface InterferometerCell {
  readonly name: string;
  readonly ringsPerArm: readonly [number, number];
  /** Plain delay of each arm in unit delays. */
  readonly armDelay: readonly [number, number];
  /** Round trip of the cell's rings in unit delays. */
  readonly ringDelay: number;
  /** input, output, ring1…ringN: exactly one each. */
  readonly couplers: readonly Coupler[];
}

export interface Losses {
  /** Waveguide loss of one unit delay, dB (power). */
  readonly unitDelayLossDb: number;
  readonly couplerExcessLossDb: number;
  /** Fibre-to-chip loss per facet, dB. On record; transmission is judged relative to a straight guide. */
  readonly facetLossDb: number;
}

export interface DriverChannel {
  readonly channel: string;
  /** Element path. */
  readonly drives: string;
  /** Calibration: rad per mW of this heater at its own element. */
  readonly phasePerMw: number;
  /** Calibration: the element's phase with every heater off, at the chip's reference frequency, rad. */
  readonly phaseAtZeroRad: number;
  readonly resistanceOhm: number;
  readonly currentLimitMa: number;
  readonly powerLimitMw: number;
  /** Driver step, mA. */
  readonly resolutionMa: number;
}

export interface ChipModel {
  readonly referenceFrequencyThz: number;
  readonly fsrGhz: number;
  readonly cells: readonly InterferometerCell[];
  readonly join: CellJoin;
  readonly losses: Losses;
  readonly channels: readonly DriverChannel[];
  /**
   * n × n, row by row, diagonal 1: entry (i, j) is the share of heater j's power that acts at element i like power of
   * its own heater. phase_i = phaseAtZeroRad_i + phasePerMw_i · Σ_j crosstalk_ij · power_j.
   */
  readonly crosstalk: readonly number[];
  readonly totalPowerLimitMw?: number;
  /** Least phase a heater in use is driven to, so that tuning can go both ways. Default 0.5 rad. */
  readonly heaterFloorRad: number;
  /** Incoherent light that no setting removes: rejections beyond this are refused, dB > 0. */
  readonly rejectionFloorDb?: number;
  /** Temperature at which the calibration holds, °C. */
  readonly temperatureC?: number;
}
