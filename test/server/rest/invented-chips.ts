/** Chips that do not exist, as a lab would register them. All names and numbers are invented. */
import type { ChipModelInput } from '../../../schema/chip.ts';

/** mW for one full turn of a heater; common practice for thermo-optic phase shifters, no source. */
const TURN_MW = 40;

export interface InventedChip {
  readonly referenceFrequencyThz?: number;
  readonly fsrGhz?: number;
  /** Rings of the two arms of each cell. */
  readonly cells?: readonly (readonly [number, number])[];
}

/** Every coupler tunable, every element with a heater of its own, a little crosstalk between neighbours. */
export function inventedChip(chip: InventedChip = {}): ChipModelInput {
  const { referenceFrequencyThz = 193.1, fsrGhz = 50, cells = [[2, 2]] } = chip;
  const named = cells.map((ringsPerArm, index) => ({ name: `cell${index + 1}`, ringsPerArm }));
  const elements = named.flatMap(({ name, ringsPerArm }) => [
    `${name}.input.coupling`,
    ...Array.from({ length: ringsPerArm[0] + ringsPerArm[1] }, (_, k) => [
      `${name}.ring${k + 1}.coupling`,
      `${name}.ring${k + 1}.phase`,
    ]).flat(),
    `${name}.arm.phase`,
    `${name}.output.coupling`,
  ]);
  const couplersOf = (rings: number) =>
    ['input', ...Array.from({ length: rings }, (_, k) => `ring${k + 1}`), 'output'].map((element) => ({
      element,
      tunable: true,
      minCoupling: 0,
      maxCoupling: 1,
    }));
  return {
    referenceFrequencyThz,
    fsr: { fsrGhz },
    cells: named.map(({ name, ringsPerArm }) => ({
      interferometer: {
        name,
        ringsPerArm: [...ringsPerArm],
        couplers: couplersOf(ringsPerArm[0] + ringsPerArm[1]),
      },
    })),
    losses: { unitDelayLossDb: 0.05, couplerExcessLossDb: 0.01 },
    channels: elements.map((drives, index) => ({
      channel: String(index + 1).padStart(2, '0'),
      drives,
      phasePerMw: (2 * Math.PI) / TURN_MW,
      phaseAtZeroRad: 0.1 * ((index * 7) % 11),
      resistanceOhm: 500,
      currentLimitMa: 20,
      powerLimitMw: 160,
      resolutionMa: 0.0005,
    })),
    crosstalk: elements.map((_, i) =>
      elements.map((__, j) => (i === j ? 1 : Math.abs(i - j) === 1 ? 0.01 : 0)),
    ),
  };
}
