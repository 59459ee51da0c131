/** The chip's losses put onto a circuit: waveguide loss by length, excess loss on every coupler. */
import type { ArmParameters, CircuitParameters } from '../circuit/circuit.ts';
import type { ChipModel } from './model.ts';

/** Power that is left after one turn of a unit-delay ring, its coupler's excess loss included: (g·a)². */
export function powerPerTurn(chip: ChipModel, ringDelay: number): number {
  const lossDb = chip.losses.unitDelayLossDb * ringDelay + chip.losses.couplerExcessLossDb;
  return 10 ** (-lossDb / 10);
}

function withArmLoss(arm: ArmParameters, unitDelayLossDb: number): ArmParameters {
  return {
    ...arm,
    lossDb: unitDelayLossDb * arm.delay,
    rings: arm.rings.map((ring) => ({ ...ring, lossDb: unitDelayLossDb * ring.delay })),
  };
}

/**
 * The same circuit with the loss of this chip: unit-delay loss on rings and plain delays, excess loss on couplers.
 * Facet loss stays out: transmission is relative to a straight guide on the chip.
 */
export function withChipLosses(circuit: CircuitParameters, chip: ChipModel): CircuitParameters {
  const { unitDelayLossDb, couplerExcessLossDb } = chip.losses;
  return {
    join: circuit.join,
    cells: circuit.cells.map((cell) => ({
      ...cell,
      arms: [withArmLoss(cell.arms[0], unitDelayLossDb), withArmLoss(cell.arms[1], unitDelayLossDb)],
      couplerExcessLossDb,
    })),
  };
}
