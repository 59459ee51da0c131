/** The parts of a chip model as they cross the wire, each in its own ranges. */
import { z } from 'zod';
import { LIMITS } from './limits.ts';
import { type OneOf, oneOfRule } from './one-of.ts';
import { cellNameRule, nameRule } from './text.ts';

/** Optical frequencies a chip may be meant for, THz (500 nm to 2,998 nm). */
const THZ_RANGE = { min: 100, max: 500 } as const;

export const delayRule = z.strictObject({
  unitDelayLengthUm: z.number().positive().max(1e7),
  groupIndex: z.number().min(1).max(10),
});

export const fsrRule = oneOfRule({ fsrGhz: z.number().min(0.01).max(100_000), delay: delayRule });

const couplingRule = z.number().min(0).max(1);

export const couplerRule = z.strictObject({
  element: z.string().regex(/^(input|output|ring[1-9][0-9]?)$/, {
    error: 'must be "input", "output" or "ring1", "ring2", …',
  }),
  tunable: z.boolean(),
  powerCrossCoupling: couplingRule.optional(),
  minCoupling: couplingRule.optional(),
  maxCoupling: couplingRule.optional(),
  heatedArm: z.enum(['UPPER', 'LOWER']).optional(),
});

export const interferometerCellRule = z.strictObject({
  name: cellNameRule,
  ringsPerArm: z.array(z.int().min(0).max(LIMITS.ringsPerArm)).length(2),
  armDelay: z.array(z.number().min(0).max(1000)).length(2).optional(),
  ringDelay: z.number().positive().max(1000).optional(),
  couplers: z
    .array(couplerRule)
    .min(2)
    .max(2 + 2 * LIMITS.ringsPerArm),
});

export const cellRule = oneOfRule({ interferometer: interferometerCellRule });

export const lossesRule = z.strictObject({
  unitDelayLossDb: z.number().min(0).max(100),
  couplerExcessLossDb: z.number().min(0).max(100),
  facetLossDb: z.number().min(0).max(100).optional(),
});

export const driverChannelRule = z.strictObject({
  channel: nameRule,
  drives: z.string().max(100),
  phasePerMw: z.number().positive().max(1000),
  phaseAtZeroRad: z.number().min(-1000).max(1000),
  resistanceOhm: z.number().positive().max(1e7),
  currentLimitMa: z.number().positive().max(10_000),
  powerLimitMw: z.number().positive().max(100_000),
  /** At least 10 nA, so that the six decimal places of a setting sheet name one step and no other. */
  resolutionMa: z.number().min(1e-5).max(1000),
});

/** The whole model without the checks between its parts. */
export const chipPartsRule = z.strictObject({
  referenceFrequencyThz: z.number().min(THZ_RANGE.min).max(THZ_RANGE.max),
  fsr: fsrRule,
  cells: z.array(cellRule).min(1).max(LIMITS.cells),
  cellJoin: z.enum(['OUT1', 'OUT2', 'BOTH']).optional(),
  losses: lossesRule,
  channels: z.array(driverChannelRule).min(1).max(LIMITS.channels),
  crosstalk: z.array(z.array(z.number().min(-1).max(1))).optional(),
  totalPowerLimitMw: z.number().positive().max(1e6).optional(),
  heaterFloorRad: z.number().min(0).max(6.5).optional(),
  rejectionFloorDb: z.number().positive().max(200).optional(),
  temperatureC: z.number().min(-273.15).max(200).optional(),
});

export type CouplerInput = z.infer<typeof couplerRule>;
export type InterferometerCellInput = z.infer<typeof interferometerCellRule>;
export type CellInput = OneOf<{ interferometer: InterferometerCellInput }>;
export type LossesInput = z.infer<typeof lossesRule>;
export type DriverChannelInput = z.infer<typeof driverChannelRule>;
export type ChipModelInput = z.infer<typeof chipPartsRule>;
