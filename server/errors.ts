/**
 * Everything that is refused leaves the operations as a `ProblemError`; REST sends its problem as
 * `application/problem+json`, GraphQL as `extensions`, the store keeps it as data.
 */
import { randomUUID } from 'node:crypto';
import type { Nearest, Problem } from '../schema/problem.ts';
import type { RefusalDetails } from '../src/errors.ts';
import { ProblemError, type ProblemMembers, problemOf, refuse } from './problem-error.ts';
import type { Role } from './store/records.ts';

export { ProblemError, type ProblemMembers, problemOf, refuse } from './problem-error.ts';
export { problemOfZod } from './problem-of-zod.ts';
export { problemPage, problemSlugs } from './problem-table.ts';

export function badInput(detail: string, more: ProblemMembers = {}): ProblemError {
  return refuse('BAD_INPUT', detail, more);
}

export function notFound(what: string, pointer?: string, given?: unknown): ProblemError {
  return refuse('NOT_FOUND', `There is no ${what}, or this token may not see it.`, {
    ...(pointer === undefined ? {} : { pointer }),
    ...(given === undefined ? {} : { given }),
  });
}

export type TokenFault = 'MISSING' | 'MALFORMED' | 'UNKNOWN' | 'EXPIRED' | 'REVOKED';

const TOKEN_FAULTS: Readonly<Record<TokenFault, string>> = {
  MISSING: 'The request carries no token. Send the header "Authorization: Bearer <token>".',
  MALFORMED: 'The token is malformed: it must read rbt_<12 characters>_<43 characters>.',
  UNKNOWN: 'The token is malformed or was never issued by this service.',
  EXPIRED: 'The token has expired.',
  REVOKED: 'The token has been revoked.',
};

/** RFC 6750 section 3: no error code in the challenge when no token came at all. */
export function unauthenticated(fault: TokenFault): ProblemError {
  const challenge = fault === 'MISSING' ? '' : ', error="invalid_token"';
  return refuse(
    'UNAUTHENTICATED',
    TOKEN_FAULTS[fault],
    {},
    { 'www-authenticate': `Bearer realm="ringbinder"${challenge}` },
  );
}

export function forbidden(action: string, role: Role, allowed: readonly Role[]): ProblemError {
  const detail = `The role ${role} may not ${action}; ${allowed.join(', ')} may.`;
  return refuse('FORBIDDEN', detail, { given: role, allowed });
}

export function staleChipRevision(detail: string, more: ProblemMembers): ProblemError {
  return refuse('STALE_CHIP_REVISION', detail, more);
}

/** @param present the number the record has now */
export function preconditionFailed(
  detail: string,
  more: ProblemMembers & { readonly allowed: number },
): ProblemError {
  return refuse('PRECONDITION_FAILED', detail, more);
}

export function keyReused(key: string): ProblemError {
  const detail = `The idempotency key "${key}" was used before with another operation or body.`;
  return refuse('IDEMPOTENCY_KEY_REUSED', detail, { pointer: '/idempotencyKey', given: key });
}

/** Seconds after which trying again makes sense while the database is away or the queue is full. */
const RETRY_AFTER_SECONDS = 2;

export function serviceUnavailable(detail: string, cause?: unknown): ProblemError {
  const problem = problemOf('SERVICE_UNAVAILABLE', detail);
  return new ProblemError(problem, { 'retry-after': String(RETRY_AFTER_SECONDS) }, { cause });
}

export function queueFull(limit: number): ProblemError {
  const detail = `More than ${limit} computations are waiting.`;
  return refuse(
    'QUEUE_FULL',
    detail,
    { allowed: { max: limit } },
    { 'retry-after': String(RETRY_AFTER_SECONDS) },
  );
}

export function tooManyOpen(what: string, limit: number): ProblemError {
  const detail = `This token has ${limit} ${what} open, as many as it may.`;
  return refuse(
    'TOO_MANY_OPEN',
    detail,
    { allowed: { max: limit } },
    { 'retry-after': String(RETRY_AFTER_SECONDS) },
  );
}

export function rateLimited(retryAfterSeconds: number, perSecond: number): ProblemError {
  const seconds = Math.max(1, Math.ceil(retryAfterSeconds));
  const detail = `This token sends more than ${perSecond} requests a second. Try again in ${seconds} s.`;
  return refuse('RATE_LIMITED', detail, { allowed: { perSecond } }, { 'retry-after': String(seconds) });
}

/**
 * A refusal of the core, still in canonical pointers and units: what the store keeps by the question's hash, whoever
 * asked. `nearest[].input` is filled for the asker by `problemForAsker` (operations).
 */
export function problemOfRefusal(details: RefusalDetails): Problem {
  const nearest: Nearest[] = (details.nearest ?? []).map(({ reason, changes }) => ({
    reason,
    changes,
    input: null,
  }));
  return problemOf(details.code, details.detail, {
    ...(details.pointer === undefined ? {} : { pointer: details.pointer }),
    ...(details.given === undefined ? {} : { given: details.given }),
    ...(details.allowed === undefined ? {} : { allowed: details.allowed }),
    ...(details.limit === undefined ? {} : { limit: details.limit }),
    nearest,
  });
}

/** Anything nobody foresaw: an id for the log and nothing else leaves the house. The cause is kept for the log. */
export function problemOfUnknown(error: unknown): ProblemError {
  if (error instanceof ProblemError) return error;
  if (error instanceof Error && error.name === 'StoreUnavailable') {
    return serviceUnavailable(
      'The database cannot be reached at the moment. Nothing was lost; try again.',
      error,
    );
  }
  const id = randomUUID();
  const problem = problemOf('INTERNAL', `A defect in the service; its log holds more under ${id}.`, {
    instance: `urn:uuid:${id}`,
  });
  return new ProblemError(problem, {}, { cause: error });
}
