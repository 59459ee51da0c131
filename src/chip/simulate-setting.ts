/** The circuit that a chip is at given currents: what is judged. */
import type { CircuitParameters, InterferometerParameters } from '../circuit/circuit.ts';
import { couplerAt } from './coupler.ts';
import { powerMw } from './currents.ts';
import { couplerOf, ringCount } from './elements.ts';
import { foldJoined, foldSingly, type UnfoldedCell } from './fold.ts';
import { phasesFromPowers } from './heaters.ts';
import type { ChipModel } from './model.ts';
import type { Setting } from './setting.ts';

/** Phases by element path; an element without a heater rests at 0. */
type PhaseOf = (path: string) => number;

function unfoldedCell(chip: ChipModel, index: number, phaseOf: PhaseOf): UnfoldedCell {
  const cell = chip.cells[index]!;
  const { unitDelayLossDb, couplerExcessLossDb } = chip.losses;
  const stateOf = (element: string) =>
    couplerAt(couplerOf(cell, element), phaseOf(`${cell.name}.${element}.coupling`));
  const rings = Array.from({ length: ringCount(cell) }, (_, k) => stateOf(`ring${k + 1}`));
  const ringParameters = rings.map((state, k) => ({
    powerCrossCoupling: state.powerCrossCoupling,
    phaseRad: phaseOf(`${cell.name}.ring${k + 1}.phase`),
    lossDb: unitDelayLossDb * cell.ringDelay,
    delay: cell.ringDelay,
  }));
  const upper = cell.ringsPerArm[0];
  const arm = (which: 0 | 1, phaseRad: number) => ({
    rings: which === 0 ? ringParameters.slice(0, upper) : ringParameters.slice(upper),
    delay: cell.armDelay[which],
    phaseRad,
    lossDb: unitDelayLossDb * cell.armDelay[which],
  });
  const input = stateOf('input');
  const output = stateOf('output');
  const parameters: InterferometerParameters = {
    inputCoupling: input.powerCrossCoupling,
    outputCoupling: output.powerCrossCoupling,
    arms: [arm(0, 0), arm(1, phaseOf(`${cell.name}.arm.phase`))],
    couplerExcessLossDb,
  };
  return { input, output, rings, cell: parameters };
}

/** The circuit at given phases of the driven elements, in channel order (rad), with the chip's losses. */
function circuitOfPhases(phasesRad: ArrayLike<number>, chip: ChipModel): CircuitParameters {
  const phases = new Map(chip.channels.map((channel, i) => [channel.drives, phasesRad[i]!]));
  const phaseOf = (path: string) => phases.get(path) ?? 0;
  const unfolded = chip.cells.map((_, index) => unfoldedCell(chip, index, phaseOf));
  return { cells: chip.join === 'BOTH' ? foldJoined(unfolded) : foldSingly(unfolded), join: chip.join };
}

/**
 * The circuit of a setting, or of bare currents in channel order (mA), from the currents alone: heater powers, thermal
 * crosstalk, coupler physics, losses. Each output is right up to a constant phase of its own. On a chip whose cells join
 * by both guides two joining couplers appear as one (see `fold.ts`); the response is the same. Cost O(channels²).
 */
export function circuitOfSetting(setting: Setting | ArrayLike<number>, chip: ChipModel): CircuitParameters {
  const currents: ArrayLike<number> =
    'channels' in setting ? setting.channels.map((channel) => channel.currentMa) : setting;
  const powers = Float64Array.from(chip.channels, (channel, i) =>
    powerMw(currents[i]!, channel.resistanceOhm),
  );
  return circuitOfPhases(phasesFromPowers(chip, powers), chip);
}
