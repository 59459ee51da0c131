/**
 * The parameters of a circuit as one flat array: what an optimiser writes and `refreshKernel` reads. Per cell: three
 * numbers of its own, three an arm, then four a ring, rings of arm 0 first.
 */
import type { ArmParameters, CircuitParameters } from './circuit.ts';

export const CELL_PARAMETER = { inputCoupling: 0, outputCoupling: 1, couplerExcessLossDb: 2 } as const;
export const ARM_PARAMETER = { phaseRad: 0, delay: 1, lossDb: 2 } as const;
export const RING_PARAMETER = { powerCrossCoupling: 0, phaseRad: 1, lossDb: 2, delay: 3 } as const;

const CELL_SIZE = 3;
const ARM_SIZE = 3;
const RING_SIZE = 4;

/** Where one cell's numbers start in the flat array. */
export interface CellLayout {
  readonly cellAt: number;
  readonly armAt: readonly [number, number];
  /** Start of every ring, arm 0 first. */
  readonly ringAt: readonly number[];
  readonly ringsPerArm: readonly [number, number];
}

export function layoutOf(circuit: CircuitParameters): readonly CellLayout[] {
  let at = 0;
  return circuit.cells.map((cell) => {
    const ringsPerArm = [cell.arms[0].rings.length, cell.arms[1].rings.length] as const;
    const cellAt = at;
    const ringsAt = cellAt + CELL_SIZE + 2 * ARM_SIZE;
    const rings = ringsPerArm[0] + ringsPerArm[1];
    at = ringsAt + rings * RING_SIZE;
    return {
      cellAt,
      armAt: [cellAt + CELL_SIZE, cellAt + CELL_SIZE + ARM_SIZE] as const,
      ringAt: Array.from({ length: rings }, (_, ring) => ringsAt + ring * RING_SIZE),
      ringsPerArm,
    };
  });
}

export function sizeOf(layout: readonly CellLayout[]): number {
  const rings = layout.reduce((sum, cell) => sum + cell.ringAt.length, 0);
  return layout.length * (CELL_SIZE + 2 * ARM_SIZE) + rings * RING_SIZE;
}

function writeArm(
  out: Float64Array,
  armAt: number,
  ringAt: readonly number[],
  from: number,
  arm: ArmParameters,
) {
  out[armAt + ARM_PARAMETER.phaseRad] = arm.phaseRad;
  out[armAt + ARM_PARAMETER.delay] = arm.delay;
  out[armAt + ARM_PARAMETER.lossDb] = arm.lossDb;
  for (let i = 0; i < arm.rings.length; i++) {
    const at = ringAt[from + i]!;
    const ring = arm.rings[i]!;
    out[at + RING_PARAMETER.powerCrossCoupling] = ring.powerCrossCoupling;
    out[at + RING_PARAMETER.phaseRad] = ring.phaseRad;
    out[at + RING_PARAMETER.lossDb] = ring.lossDb;
    out[at + RING_PARAMETER.delay] = ring.delay;
  }
}

/** Writes a circuit of the same structure. Throws `RangeError` when its cells or rings are others. */
export function parametersInto(
  out: Float64Array,
  layout: readonly CellLayout[],
  circuit: CircuitParameters,
): void {
  const same =
    circuit.cells.length === layout.length &&
    circuit.cells.every((cell, i) =>
      cell.arms.every((arm, a) => arm.rings.length === layout[i]?.ringsPerArm[a]),
    );
  if (!same) throw new RangeError('the circuit has other cells or rings than the kernel was made for');
  for (let c = 0; c < layout.length; c++) {
    const cell = circuit.cells[c]!;
    const { cellAt, armAt, ringAt, ringsPerArm } = layout[c]!;
    out[cellAt + CELL_PARAMETER.inputCoupling] = cell.inputCoupling;
    out[cellAt + CELL_PARAMETER.outputCoupling] = cell.outputCoupling;
    out[cellAt + CELL_PARAMETER.couplerExcessLossDb] = cell.couplerExcessLossDb;
    writeArm(out, armAt[0], ringAt, 0, cell.arms[0]);
    writeArm(out, armAt[1], ringAt, ringsPerArm[0], cell.arms[1]);
  }
}
