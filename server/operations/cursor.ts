/** Cursors: the sort key of an entry, bound to the list, filter and order it came from. */
import { canonicalJson } from '../../schema/jcs.ts';
import { refuse } from '../errors.ts';
import { sha256Hex } from './address.ts';

export type SortKey = readonly (string | number | null)[];

/** Enough of a hash to notice a foreign cursor; it guards against mistakes, not against forgery (keys are checked). */
const BINDING_CHARACTERS = 12;

function bindingOf(context: unknown): string {
  return sha256Hex(canonicalJson(context)).slice(0, BINDING_CHARACTERS);
}

export function encodeCursor(sortKey: SortKey, context: unknown): string {
  return Buffer.from(JSON.stringify([bindingOf(context), ...sortKey]), 'utf8').toString('base64url');
}

export function badCursor(given: unknown): Error {
  const detail = 'The cursor does not belong to this list with this filter and order.';
  return refuse('BAD_CURSOR', detail, { pointer: '/after', given });
}

/** @throws ProblemError BAD_CURSOR */
export function decodeCursor(cursor: string, context: unknown): SortKey {
  let read: unknown;
  try {
    read = JSON.parse(Buffer.from(cursor, 'base64url').toString('utf8'));
  } catch {
    throw badCursor(cursor);
  }
  if (!Array.isArray(read) || read[0] !== bindingOf(context)) throw badCursor(cursor);
  const key: unknown[] = read.slice(1);
  const isKey = key.every((part) => part === null || typeof part === 'string' || typeof part === 'number');
  if (!isKey) throw badCursor(cursor);
  return key as SortKey;
}
