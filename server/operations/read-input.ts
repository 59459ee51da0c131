/** From what arrived to what the rules accept. */
import type { z } from 'zod';
import { withoutNulls } from '../../schema/absent.ts';
import { canonicalJson } from '../../schema/jcs.ts';
import { badInput, problemOfZod } from '../errors.ts';
import type { Idempotency } from '../store/records.ts';
import { sha256Hex } from './address.ts';
import type { WriteOptions } from './operations.ts';

/** @throws ProblemError with every violation */
export function readInput<T>(rule: z.ZodType<T>, input: unknown, accepts?: (input: unknown) => boolean): T {
  const cleaned = withoutNulls(input);
  const read = rule.safeParse(cleaned);
  if (read.success) return read.data;
  throw problemOfZod(read.error, cleaned, accepts ?? ((mended) => rule.safeParse(mended).success));
}

/** The body as it was sent, without nulls and without the key: what is fingerprinted and kept as `asked`. */
export function askedOf(input: unknown): Readonly<Record<string, unknown>> {
  const { idempotencyKey: _, ...asked } = withoutNulls(input) as Record<string, unknown>;
  return asked;
}

/**
 * The key may come in the body or beside it. The fingerprint covers the operation and the whole input, which holds what
 * REST has in its path; so a repeat is recognised at either door.
 * @param input what its rule has accepted
 */
export function idempotencyOf(
  operation: string,
  input: { readonly idempotencyKey?: string | undefined },
  body: unknown,
  options: WriteOptions = {},
): Idempotency | undefined {
  const key = options.idempotencyKey ?? input.idempotencyKey;
  if (key === undefined) return undefined;
  if (input.idempotencyKey !== undefined && input.idempotencyKey !== key) {
    const more = { pointer: '/idempotencyKey', given: input.idempotencyKey, allowed: key };
    throw badInput('The header Idempotency-Key and /idempotencyKey differ.', more);
  }
  return { key, operation, fingerprint: sha256Hex(canonicalJson({ operation, body: askedOf(body) })) };
}
