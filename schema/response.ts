/** Which curve of a design is wanted. */
import { z } from 'zod';
import { LIMITS } from './limits.ts';
import { outputRule } from './specification.ts';
import { gridRule } from './units.ts';

export const STAGES = ['TARGET', 'CIRCUIT', 'CHIP', 'SETTING'] as const;

/** Fewest points that a reduced curve can have: two stretches, least and greatest of each. */
const LEAST_REDUCED = 4;

export const figuresAskRule = z.strictObject({
  stage: z.enum(STAGES).optional(),
  output: outputRule.optional(),
});

export const curveAskRule = z.strictObject({
  ...figuresAskRule.shape,
  grid: gridRule.optional(),
  reduceTo: z.int().min(LEAST_REDUCED).max(LIMITS.gridPoints).optional(),
});
