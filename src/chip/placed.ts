/** A design on a chip: every element of every cell has its value, and it is known what each is there for. */
import type { CellJoin, CircuitParameters, InterferometerParameters } from '../circuit/circuit.ts';
import type { OutputPort } from '../filter/specification.ts';
import { armOfRing } from './elements.ts';
import type { ChipModel } from './model.ts';
import type { Parked } from './setting.ts';

/**
 * What leaves a cell at one of its outputs. COMPLEMENT: what filter or section do not pass; ARM: one arm of an all-pass
 * pair that goes on into the next cell; NOTHING: a cell that passes the light to its other output.
 */
export type Carried = 'FILTER' | 'COMPLEMENT' | 'SECTION' | 'ARM' | 'PASSED_ON' | 'NOTHING';

export interface PlacedRing {
  /** Element path without the quantity: `cell1.ring2`. */
  readonly element: string;
  readonly arm: 0 | 1;
  readonly powerCrossCoupling: number;
  readonly phaseRad: number;
  readonly parked: boolean;
}

export interface PlacedCell {
  readonly cell: string;
  /** Which section of the cascade it realises, from 1; null for the all-pass pair and for a parked cell. */
  readonly section: number | null;
  readonly inputCoupling: number;
  readonly outputCoupling: number;
  /** Phase of arm 1 against arm 0. */
  readonly armPhaseRad: number;
  readonly rings: readonly PlacedRing[];
  readonly carries: Readonly<Record<OutputPort, Carried>>;
}

export type EndCouplings = Pick<InterferometerParameters, 'inputCoupling' | 'outputCoupling'>;

/** An interferometer from the input coupler of cell `first` to the output coupler of cell `last` that is not as wanted. */
export interface OffBalance {
  readonly first: number;
  readonly last: number;
  readonly wanted: EndCouplings;
  /** The output by which filter, section or passed light leaves. */
  readonly port: OutputPort;
  /** It only passes the light on. */
  readonly passes: boolean;
}

export interface PlacedCircuit {
  readonly cells: readonly PlacedCell[];
  /** Lossless, in chip order, rings in the chip's order, parked ones included. */
  readonly circuit: CircuitParameters;
  readonly parked: readonly Parked[];
  /** Interferometers whose input or output coupler could not be placed as wanted. */
  readonly offBalance: readonly OffBalance[];
}

/** What the planning of one cell decides. */
export interface CellPlan {
  readonly section: number | null;
  readonly inputCoupling: number;
  readonly outputCoupling: number;
  readonly armPhaseRad: number;
  readonly rings: readonly RingPlan[];
  readonly carries: Readonly<Record<OutputPort, Carried>>;
  readonly parked: readonly Parked[];
  /** On the last cell of an interferometer whose ends are not as wanted. */
  readonly offBalance?: OffBalance;
}

export interface RingPlan {
  readonly powerCrossCoupling: number;
  readonly phaseRad: number;
  readonly parked: boolean;
}

function cellCircuit(chip: ChipModel, index: number, plan: CellPlan): InterferometerParameters {
  const cell = chip.cells[index]!;
  const arm = (which: 0 | 1) => ({
    rings: plan.rings
      .filter((_, ring) => armOfRing(cell, ring) === which)
      .map(({ powerCrossCoupling, phaseRad }) => ({
        powerCrossCoupling,
        phaseRad,
        lossDb: 0,
        delay: cell.ringDelay,
      })),
    delay: cell.armDelay[which],
    phaseRad: which === 0 ? 0 : plan.armPhaseRad,
    lossDb: 0,
  });
  const { inputCoupling, outputCoupling } = plan;
  return { inputCoupling, outputCoupling, arms: [arm(0), arm(1)], couplerExcessLossDb: 0 };
}

export function assemble(chip: ChipModel, plans: readonly CellPlan[]): PlacedCircuit {
  const join: CellJoin = chip.join;
  return {
    cells: plans.map((plan, index) => {
      const cell = chip.cells[index]!;
      const rings = plan.rings.map((ring, k) => ({
        ...ring,
        element: `${cell.name}.ring${k + 1}`,
        arm: armOfRing(cell, k),
      }));
      const { section, inputCoupling, outputCoupling, armPhaseRad, carries } = plan;
      return { cell: cell.name, section, inputCoupling, outputCoupling, armPhaseRad, rings, carries };
    }),
    circuit: { cells: plans.map((plan, index) => cellCircuit(chip, index, plan)), join },
    parked: plans.flatMap((plan) => plan.parked),
    offBalance: plans.flatMap((plan) => plan.offBalance ?? []),
  };
}

/** The same placement with other values, after an optimisation of its circuit: same rings on the same arms. */
export function withCircuit(placed: PlacedCircuit, circuit: CircuitParameters): PlacedCircuit {
  return {
    ...placed,
    circuit,
    cells: placed.cells.map((cell, index) => {
      const { inputCoupling, outputCoupling, arms } = circuit.cells[index]!;
      const values = [...arms[0].rings, ...arms[1].rings];
      return {
        ...cell,
        inputCoupling,
        outputCoupling,
        armPhaseRad: arms[1].phaseRad - arms[0].phaseRad,
        rings: cell.rings.map((ring, k) => ({
          ...ring,
          powerCrossCoupling: values[k]!.powerCrossCoupling,
          phaseRad: values[k]!.phaseRad,
        })),
      };
    }),
  };
}
