/** Strings that cross the wire: names people type, free text, keys. */
import { z } from 'zod';

/** Names of chips, channels, configurations, releases: safe in a URL, in a CSV field and in an ETag without escaping. */
export const NAME_PATTERN = /^[A-Za-z0-9][A-Za-z0-9._-]{0,63}$/;
/** Names of cells: no point, because element paths are separated by points. */
const CELL_NAME_PATTERN = /^[A-Za-z0-9][A-Za-z0-9_-]{0,31}$/;
/** Names of people and instruments. */
const ACTOR_PATTERN = /^[A-Za-z0-9][A-Za-z0-9 ._@-]{0,99}$/;
/** RFC-style header values: visible ASCII. */
const IDEMPOTENCY_KEY_PATTERN = /^[\x21-\x7e]{1,128}$/;

const NAME_RULE = 'letters, digits, ".", "_" and "-", at most 64, the first a letter or a digit';

export const nameRule = z.string().regex(NAME_PATTERN, { error: `must be a name: ${NAME_RULE}` });

export const cellNameRule = z.string().regex(CELL_NAME_PATTERN, {
  error: 'must be a cell name: letters, digits, "_" and "-", at most 32, the first a letter or a digit',
});

export const actorNameRule = z.string().regex(ACTOR_PATTERN, {
  error: 'must be a name: letters, digits, spaces and "._@-", at most 100, the first a letter or a digit',
});

export const idempotencyKeyRule = z.string().regex(IDEMPOTENCY_KEY_PATTERN, {
  error: 'must be 1 to 128 visible ASCII characters',
});

/** Control characters but tab and line breaks; PostgreSQL's jsonb refuses U+0000 outright. */
// biome-ignore lint/suspicious/noControlCharactersInRegex: naming them is the purpose
const CONTROL = /[\u0000-\u0008\u000b\u000c\u000e-\u001f\u007f]/;

/** Free text: NFC, well-formed, without control characters, at most `max` UTF-16 units. */
export function textRule(max: number) {
  return z
    .string()
    .max(max)
    .refine((s) => !/\p{Surrogate}/u.test(s), { error: 'must not contain lone surrogates' })
    .refine((s) => !CONTROL.test(s), { error: 'must not contain control characters' })
    .normalize('NFC');
}

export const opaqueIdRule = z
  .string()
  .regex(/^[a-z]{3}_[0-9a-z]{1,140}$/, { error: 'must be an id of this service' });

export const dateTimeRule = z.iso.datetime({
  offset: true,
  error: 'must be an RFC 3339 time with a zone, as in 2026-03-01T09:30:00Z',
});
