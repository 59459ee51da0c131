/** If-Match and If-None-Match of writes, as the number a record is expected to have. */
import type { FastifyRequest } from 'fastify';
import { badInput, ProblemError } from '../errors.ts';
import { matchedStrongly, type TagList } from './protocol/index.ts';
import { preconditionFailed, tagsOf } from './reply.ts';

export interface Expectation {
  /** NEW: nothing may be there yet. MATCH: what is there must carry one of the tags. */
  readonly kind: 'NONE' | 'NEW' | 'MATCH';
  readonly tags?: TagList;
}

export function expectationOf(request: FastifyRequest): Expectation {
  const ifMatch = tagsOf(request, 'if-match');
  const ifNoneMatch = tagsOf(request, 'if-none-match');
  if (ifMatch && ifNoneMatch)
    throw badInput('If-Match and If-None-Match contradict each other; send one of them.');
  if (ifMatch) return { kind: 'MATCH', tags: ifMatch };
  if (ifNoneMatch === undefined) return { kind: 'NONE' };
  if (ifNoneMatch !== '*') throw badInput('If-None-Match of a write must be "*": nothing may be there yet.');
  return { kind: 'NEW' };
}

/** Our tags begin with the number of what they name. */
const LEADING_NUMBER = /^"(\d{1,9})[."]/;

/**
 * The number to expect, given the present one and its tags (`0` and none: nothing there). Where no tag matches and the
 * caller sent an idempotency key, the number of the tag itself goes on: this may be a repeat of a write that succeeded,
 * which the store answers by its key before it looks at numbers. Throws PRECONDITION_FAILED.
 */
export function expectedNumber(
  tags: TagList,
  present: { readonly number: number; readonly tags: readonly string[] },
  mayBeRepeat: boolean,
): number {
  if (matchedStrongly(tags, present.tags) !== null) return present.number;
  const asked = tags === '*' ? null : LEADING_NUMBER.exec(tags[0] ?? '')?.[1];
  if (mayBeRepeat && asked) return Number(asked);
  throw preconditionFailed(present.tags[0] ?? null);
}

/** A record that moved between our look and the write: the same answer, with the tag it has now. */
export async function withPresentTag<T>(
  write: () => Promise<T>,
  presentTag: () => Promise<string | null>,
): Promise<T> {
  try {
    return await write();
  } catch (error) {
    if (error instanceof ProblemError && error.problem.code === 'PRECONDITION_FAILED') {
      throw preconditionFailed(await presentTag());
    }
    throw error;
  }
}
