/**
 * The phases a, b, c that tunable couplers add, folded into their neighbours:
 * - a ring's coupler: the ring's round trip gains b, its arm a + c;
 * - an input coupler: arm 0 gains a, arm 1 gains b;
 * - an output coupler: arm 0 gains c; a and b stay on the outputs, where they are constant.
 * Of two couplers that meet between cells joined by both guides, a, b of the first and c of the second lie between two
 * couplers where no arm is. Their product is again one coupler with phases, so it becomes the first cell's output
 * coupler, and the second cell's input coupler becomes plain guides.
 */
import { Complex } from 'complex.js';
import type { ArmParameters, InterferometerParameters } from '../circuit/circuit.ts';
import { type CouplerState, splitCoupler } from './coupler.ts';

/** An interferometer whose couplers still carry their phases. */
export interface UnfoldedCell {
  readonly input: CouplerState;
  readonly output: CouplerState;
  readonly rings: readonly CouplerState[];
  /** Ring phases are those of the round trips alone, arm phases those of the arms alone; K is taken from the states. */
  readonly cell: InterferometerParameters;
}

const STRAIGHT: CouplerState = { powerCrossCoupling: 0, outPhase1Rad: 0, outPhase2Rad: 0, inPhase1Rad: 0 };

const phasor = (phaseRad: number): Complex => new Complex(Math.cos(phaseRad), -Math.sin(phaseRad));

/** Two couplers in a row as one. */
function joinCouplers(first: CouplerState, second: CouplerState): CouplerState {
  const [k1, k2] = [Math.sqrt(first.powerCrossCoupling), Math.sqrt(second.powerCrossCoupling)];
  const [t1, t2] = [Math.sqrt(1 - first.powerCrossCoupling), Math.sqrt(1 - second.powerCrossCoupling)];
  const upper = phasor(first.outPhase1Rad + second.inPhase1Rad);
  const lower = phasor(first.outPhase2Rad);
  const minusJ = new Complex(0, -1);
  const inner = {
    m11: upper.mul(t2 * t1).sub(lower.mul(k2 * k1)),
    m12: minusJ.mul(upper.mul(t2 * k1).add(lower.mul(k2 * t1))),
    m21: minusJ.mul(upper.mul(k2 * t1).add(lower.mul(t2 * k1))),
    m22: lower.mul(t2 * t1).sub(upper.mul(k2 * k1)),
  };
  const state = splitCoupler(inner);
  return {
    powerCrossCoupling: Math.min(1, state.powerCrossCoupling),
    outPhase1Rad: state.outPhase1Rad + second.outPhase1Rad,
    outPhase2Rad: state.outPhase2Rad + second.outPhase2Rad,
    inPhase1Rad: state.inPhase1Rad + first.inPhase1Rad,
  };
}

function foldArm(arm: ArmParameters, states: readonly CouplerState[], guidePhaseRad: number): ArmParameters {
  const added = states.reduce((sum, state) => sum + state.outPhase1Rad + state.inPhase1Rad, guidePhaseRad);
  return {
    ...arm,
    phaseRad: arm.phaseRad + added,
    rings: arm.rings.map((ring, k) => ({
      ...ring,
      powerCrossCoupling: states[k]!.powerCrossCoupling,
      phaseRad: ring.phaseRad + states[k]!.outPhase2Rad,
    })),
  };
}

/** `before`: phases on the two guides that reach the cell's arms from an earlier coupler. */
function foldCell(
  unfolded: UnfoldedCell,
  input: CouplerState,
  before: readonly [number, number],
  output: CouplerState,
): InterferometerParameters {
  const { cell, rings } = unfolded;
  const upper = cell.arms[0].rings.length;
  return {
    ...cell,
    inputCoupling: input.powerCrossCoupling,
    outputCoupling: output.powerCrossCoupling,
    arms: [
      foldArm(cell.arms[0], rings.slice(0, upper), before[0] + input.outPhase1Rad + output.inPhase1Rad),
      foldArm(cell.arms[1], rings.slice(upper), before[1] + input.outPhase2Rad),
    ],
  };
}

/** Cells joined by one guide: every cell by itself, phases on the guides between them are constant and dropped. */
export function foldSingly(cells: readonly UnfoldedCell[]): InterferometerParameters[] {
  return cells.map((unfolded) => foldCell(unfolded, unfolded.input, [0, 0], unfolded.output));
}

/** Cells joined by both guides: each pair of joining couplers becomes one. */
export function foldJoined(cells: readonly UnfoldedCell[]): InterferometerParameters[] {
  const joints = cells.slice(1).map((next, k) => joinCouplers(cells[k]!.output, next.input));
  return cells.map((unfolded, k) => {
    const behind = joints[k - 1];
    const input = behind ? STRAIGHT : unfolded.input;
    const before: readonly [number, number] = behind ? [behind.outPhase1Rad, behind.outPhase2Rad] : [0, 0];
    return foldCell(unfolded, input, before, joints[k] ?? unfolded.output);
  });
}
