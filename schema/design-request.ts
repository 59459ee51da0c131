/** Asking for a design. */
import { z } from 'zod';
import { filterSpecificationRule, synthesisRule } from './specification.ts';
import { idempotencyKeyRule, nameRule, opaqueIdRule } from './text.ts';

export const REQUEST_STATES = ['QUEUED', 'RUNNING', 'DONE', 'FAILED', 'CANCELLED'] as const;

export const requestDesignRule = z.strictObject({
  chip: nameRule,
  chipRevision: z.int().min(1).optional(),
  specification: filterSpecificationRule,
  synthesis: synthesisRule.optional(),
  idempotencyKey: idempotencyKeyRule.optional(),
});

export type RequestDesignInput = z.infer<typeof requestDesignRule>;

export const cancelDesignRequestRule = z.strictObject({ id: opaqueIdRule });

export const designRequestFilterRule = z.strictObject({
  chip: nameRule.optional(),
  state: z.array(z.enum(REQUEST_STATES)).max(REQUEST_STATES.length).optional(),
  mine: z.boolean().optional(),
});
