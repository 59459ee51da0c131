/** Arguments of every list. */
import { z } from 'zod';
import { LIMITS } from './limits.ts';
import { ARCHITECTURES, FAMILIES } from './specification.ts';
import { dateTimeRule, nameRule, opaqueIdRule } from './text.ts';

/** Longest cursor that this service gives out, with room. */
const CURSOR_CHARACTERS = 1_000;

export const pageRule = z.strictObject({
  first: z.int().min(0).max(LIMITS.pageSize).optional(),
  after: z.string().max(CURSOR_CHARACTERS).optional(),
});

export const DESIGN_ORDERS = ['NEWEST', 'REJECTION'] as const;
export const designOrderRule = z.enum(DESIGN_ORDERS);

export const designFilterRule = z.strictObject({
  chip: nameRule.optional(),
  family: z.enum(FAMILIES).optional(),
  architecture: z.enum(ARCHITECTURES).optional(),
  met: z.boolean().optional(),
  minRejectionDb: z.number().optional(),
  maxInsertionLossDb: z.number().optional(),
  createdAfter: dateTimeRule.optional(),
  createdBefore: dateTimeRule.optional(),
});

export const historyFilterRule = z.strictObject({
  chip: nameRule.optional(),
  actor: opaqueIdRule.optional(),
  action: z
    .string()
    .regex(/^[a-z]+(\.[a-z]+)*$/, { error: 'must be an action, as in chip.revised' })
    .max(100)
    .optional(),
  after: dateTimeRule.optional(),
  before: dateTimeRule.optional(),
});
