/** Path parameters and request headers that several nouns share. */
import type { FastifyRequest } from 'fastify';
import { z } from 'zod';
import { NAME_PATTERN } from '../../schema/text.ts';
import { badInput, notFound } from '../errors.ts';
import type { Operations, WriteOptions } from '../operations/index.ts';
import type { ChipRecord } from '../store/records.ts';
import { viewerOf } from './frame/index.ts';
import { readIdempotencyKey } from './protocol/index.ts';

const name = z.string().regex(NAME_PATTERN);

export const serialParams = z.object({ serial: name.describe('Serial of the chip.') });

export const paramOf = (request: FastifyRequest, parameter: string): string =>
  (request.params as Record<string, string>)[parameter] ?? '';

/** A whole number of a path, from 1; null: no such thing can exist. */
export function numberOf(text: string): number | null {
  return /^[1-9]\d{0,8}$/.test(text) ? Number(text) : null;
}

/** What can be no name is the name of nothing. */
export async function chipOf(request: FastifyRequest, operations: Operations): Promise<ChipRecord> {
  const serial = paramOf(request, 'serial');
  const chip = NAME_PATTERN.test(serial) ? await operations.findChip(viewerOf(request), serial) : null;
  if (!chip) throw notFound(`chip ${serial.slice(0, 64)}`);
  return chip;
}

export function writeOptionsOf(request: FastifyRequest): WriteOptions {
  const key = readIdempotencyKey(request.headers['idempotency-key']);
  if (key === null)
    throw badInput('Idempotency-Key must be 1 to 128 visible ASCII characters, with or without quotes.');
  return key === undefined ? {} : { idempotencyKey: key };
}
