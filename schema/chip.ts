/** What a lab registers about a chip, checked as a whole, and the canonical model the core takes. */
import type { ChipModel, Coupler, InterferometerCell } from '../src/chip/model.ts';
import { NM_THZ } from '../src/conventions.ts';
import { type CellInput, type ChipModelInput, type CouplerInput, chipPartsRule } from './chip-parts.ts';
import { checkReferences } from './chip-references.ts';

export type { ChipModelInput } from './chip-parts.ts';

export const chipModelRule = chipPartsRule.check((ctx) => checkReferences(ctx.value, ctx.issues));

/** Least phase a heater in use is driven to when the model does not say: leaves room to tune both ways. */
const DEFAULT_HEATER_FLOOR_RAD = 0.5;

function couplerOf(input: CouplerInput): Coupler {
  const fixed = input.powerCrossCoupling;
  return {
    element: input.element,
    tunable: input.tunable,
    ...(fixed === undefined ? {} : { powerCrossCoupling: fixed }),
    minCoupling: fixed ?? input.minCoupling ?? 0,
    maxCoupling: fixed ?? input.maxCoupling ?? 1,
    heatedArm: input.heatedArm ?? 'UPPER',
  };
}

function cellOf({ interferometer: cell }: CellInput): InterferometerCell {
  const arms = cell.armDelay ?? [0, 0];
  return {
    name: cell.name,
    ringsPerArm: [cell.ringsPerArm[0]!, cell.ringsPerArm[1]!],
    armDelay: [arms[0]!, arms[1]!],
    ringDelay: cell.ringDelay ?? 1,
    couplers: cell.couplers.map(couplerOf),
  };
}

/** FSR of a unit delay of length L and group index n_g: c/(n_g·L). */
function fsrGhzOf(fsr: ChipModelInput['fsr']): number {
  if (fsr.fsrGhz !== undefined) return fsr.fsrGhz;
  return NM_THZ / (fsr.delay.groupIndex * fsr.delay.unitDelayLengthUm);
}

function crosstalkOf(input: ChipModelInput): number[] {
  const n = input.channels.length;
  if (input.crosstalk !== undefined) return input.crosstalk.flat();
  return Array.from({ length: n * n }, (_, i) => (i % (n + 1) === 0 ? 1 : 0));
}

/** The model in the core's terms: FSR resolved, defaults filled. Takes what `chipModelRule` has accepted. */
export function chipModelOf(input: ChipModelInput): ChipModel {
  return {
    referenceFrequencyThz: input.referenceFrequencyThz,
    fsrGhz: fsrGhzOf(input.fsr),
    cells: input.cells.map(cellOf),
    join: input.cellJoin ?? 'OUT1',
    losses: { ...input.losses, facetLossDb: input.losses.facetLossDb ?? 0 },
    channels: input.channels,
    crosstalk: crosstalkOf(input),
    heaterFloorRad: input.heaterFloorRad ?? DEFAULT_HEATER_FLOOR_RAD,
    ...(input.totalPowerLimitMw === undefined ? {} : { totalPowerLimitMw: input.totalPowerLimitMw }),
    ...(input.rejectionFloorDb === undefined ? {} : { rejectionFloorDb: input.rejectionFloorDb }),
    ...(input.temperatureC === undefined ? {} : { temperatureC: input.temperatureC }),
  };
}
