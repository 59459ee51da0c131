/** Registering chips, saving versions, publishing, and tokens. */
import { z } from 'zod';
import { chipModelRule } from './chip.ts';
import { LIMITS } from './limits.ts';
import { actorNameRule, dateTimeRule, idempotencyKeyRule, nameRule, opaqueIdRule, textRule } from './text.ts';

export const ROLES = ['READER', 'DESIGNER', 'INSTRUMENT', 'ADMIN'] as const;
export const ACTOR_KINDS = ['PERSON', 'INSTRUMENT', 'SYSTEM'] as const;

/** The release name that is meant when none is given. */
export const DEFAULT_RELEASE = 'current';

const noteRule = textRule(LIMITS.noteCharacters);

export const registerChipRule = z.strictObject({
  serial: nameRule,
  description: textRule(LIMITS.descriptionCharacters).optional(),
  model: chipModelRule,
  idempotencyKey: idempotencyKeyRule.optional(),
});

export const reviseChipRule = z.strictObject({
  chip: nameRule,
  expectedRevision: z.int().min(1),
  model: chipModelRule,
  note: noteRule.optional(),
  idempotencyKey: idempotencyKeyRule.optional(),
});

export const saveVersionRule = z.strictObject({
  chip: nameRule,
  configuration: nameRule,
  design: opaqueIdRule,
  expectedVersion: z.int().min(0).optional(),
  note: noteRule.optional(),
  idempotencyKey: idempotencyKeyRule.optional(),
});

const cautionCodeRule = z
  .string()
  .regex(/^[A-Z][A-Z0-9_]{0,63}$/, { error: 'must be the code of a caution' });

export const publishReleaseRule = z.strictObject({
  chip: nameRule,
  name: nameRule.optional(),
  configuration: nameRule,
  version: z.int().min(1),
  expectedSequence: z.int().min(0).optional(),
  note: noteRule.optional(),
  accept: z.array(cautionCodeRule).max(LIMITS.acceptedCautions).optional(),
  idempotencyKey: idempotencyKeyRule.optional(),
});

export const createTokenRule = z.strictObject({
  actor: actorNameRule,
  actorKind: z.enum(ACTOR_KINDS).optional(),
  role: z.enum(ROLES),
  label: textRule(LIMITS.labelCharacters),
  expiresAt: dateTimeRule.optional(),
});

export const revokeTokenRule = z.strictObject({ id: opaqueIdRule });
