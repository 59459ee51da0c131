/**
 * A circuit as the synthesis makes it and as the kernel simulates it: an ordered cascade of ring-loaded
 * interferometers with *effective* parameters. Phases that real tunable couplers add are already folded into ring and
 * arm phases here; `src/chip` knows how to take them apart again.
 */

/** One ring on one arm. */
export interface RingParameters {
  /** Power cross-coupling K of the ring's coupler, 0…1. */
  readonly powerCrossCoupling: number;
  /** Extra phase of one round trip, rad: pole at √(1−K)·a·exp(−jφ). */
  readonly phaseRad: number;
  /** Round-trip loss, dB (power), of the ring's waveguide alone. */
  readonly lossDb: number;
  /** Round-trip length in unit delays; 1 unless the chip's model says otherwise. */
  readonly delay: number;
}

export interface ArmParameters {
  readonly rings: readonly RingParameters[];
  /** Plain delay of the arm in unit delays, ≥ 0. */
  readonly delay: number;
  readonly phaseRad: number;
  /** Loss of the arm's plain waveguide, dB (power). */
  readonly lossDb: number;
}

export interface InterferometerParameters {
  readonly inputCoupling: number;
  readonly outputCoupling: number;
  readonly arms: readonly [ArmParameters, ArmParameters];
  /** Loss of every coupler of the cell (input, output, each ring's), dB (power), on both of its outputs. */
  readonly couplerExcessLossDb: number;
}

/**
 * How a cell's outputs continue into the next cell: out1 → in1 only, out2 → in1 only (the other output ends in an
 * absorber), or both guides (out1 → in1, out2 → in2).
 */
export type CellJoin = 'OUT1' | 'OUT2' | 'BOTH';

export interface CircuitParameters {
  readonly cells: readonly InterferometerParameters[];
  readonly join: CellJoin;
}

/** The flat signal-flow netlist that is exported and accepted; delays in unit delays, losses in dB (power). */
export type NetlistElement =
  | {
      readonly id: string;
      readonly kind: 'coupler';
      readonly powerCrossCoupling: number;
      readonly excessLossDb: number;
    }
  | {
      readonly id: string;
      readonly kind: 'waveguide';
      readonly delay: number;
      readonly phase: number;
      readonly lossDb: number;
    };

export interface Netlist {
  readonly elements: readonly NetlistElement[];
  /** [from, to]: an output port `id.out…` to an input port `id.in…`. */
  readonly connections: readonly (readonly [string, string])[];
  /** in1, in2, out1, out2 of the whole, where they exist. */
  readonly ports: Readonly<Record<string, string>>;
}
