/** Chip models that belong to no chip. All names and numbers are invented. */
import type { ChipModelInput } from '../../schema/chip.ts';

const channel = (name: string, drives: string) => ({
  channel: name,
  drives,
  phasePerMw: 0.16,
  phaseAtZeroRad: 0.4,
  resistanceOhm: 500,
  currentLimitMa: 20,
  powerLimitMw: 160,
  resolutionMa: 0.0005,
});

/** One cell with a ring in each arm; the output coupler is fixed. */
export function smallModel(): ChipModelInput {
  return {
    referenceFrequencyThz: 193.1,
    fsr: { fsrGhz: 50 },
    cells: [
      {
        interferometer: {
          name: 'cell1',
          ringsPerArm: [1, 1],
          couplers: [
            { element: 'input', tunable: true, minCoupling: 0.01, maxCoupling: 0.99 },
            { element: 'ring1', tunable: true },
            { element: 'ring2', tunable: true },
            { element: 'output', tunable: false, powerCrossCoupling: 0.5 },
          ],
        },
      },
    ],
    losses: { unitDelayLossDb: 0.1, couplerExcessLossDb: 0.02 },
    channels: [
      channel('01', 'cell1.input.coupling'),
      channel('02', 'cell1.ring1.coupling'),
      channel('03', 'cell1.ring1.phase'),
      channel('04', 'cell1.ring2.coupling'),
      channel('05', 'cell1.ring2.phase'),
      channel('06', 'cell1.arm.phase'),
    ],
  };
}
