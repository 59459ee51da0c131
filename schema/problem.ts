/** The one shape of everything that goes wrong, whichever way it travels (RFC 9457 members first). */
import { z } from 'zod';

/** Every code, each with one home in `server/errors.ts`; the SDL's descriptions list the same. */
export const PROBLEM_CODES = [
  'BAD_INPUT',
  'BAD_CURSOR',
  'QUERY_TOO_DEEP',
  'QUERY_TOO_EXPENSIVE',
  'UNAUTHENTICATED',
  'FORBIDDEN',
  'NOT_FOUND',
  'METHOD_NOT_ALLOWED',
  'NOT_ACCEPTABLE',
  'TOO_LARGE',
  'UNSUPPORTED_MEDIA_TYPE',
  'STALE_CHIP_REVISION',
  'ALREADY_FINISHED',
  'NAME_TAKEN',
  'CAUTION_NOT_ACCEPTED',
  'LAST_ADMIN',
  'PRECONDITION_FAILED',
  'PRECONDITION_REQUIRED',
  'SPECIFICATION_INVALID',
  'WRONG_UNIT',
  'BANDS_COLLIDE',
  'SPECIFICATION_UNREACHABLE',
  'SETTING_UNREACHABLE',
  'IDEMPOTENCY_KEY_REUSED',
  'RATE_LIMITED',
  'TOO_MANY_OPEN',
  'SERVICE_UNAVAILABLE',
  'QUEUE_FULL',
  'INTERNAL',
  'COMPUTATION_CRASHED',
  'COMPUTATION_TIMED_OUT',
  'ENGINE_RETIRED',
] as const;

export type ProblemCode = (typeof PROBLEM_CODES)[number];

export const PROBLEM_LIMITS = [
  'PASSIVITY',
  'ORDER',
  'RINGS',
  'COUPLING_RANGE',
  'FREE_SPECTRAL_RANGE',
  'CHANNEL_CURRENT',
  'CHANNEL_POWER',
  'TOTAL_POWER',
  'REJECTION_FLOOR',
  'GRID_POINTS',
] as const;

export type ProblemLimit = (typeof PROBLEM_LIMITS)[number];

export const fieldProblemRule = z.strictObject({
  code: z.enum(PROBLEM_CODES),
  pointer: z.string(),
  detail: z.string(),
  given: z.json().optional(),
  allowed: z.json().optional(),
});

export const nearestChangeRule = z.strictObject({
  pointer: z.string(),
  given: z.json(),
  works: z.json(),
  unit: z.string().optional(),
});

export const nearestRule = z.strictObject({
  reason: z.string(),
  changes: z.array(nearestChangeRule),
  input: z.json(),
});

/** `given`, `allowed`, `input`, `works`: any JSON. Absent members are left out. */
export const problemRule = z.strictObject({
  type: z.string(),
  title: z.string(),
  status: z.int(),
  code: z.enum(PROBLEM_CODES),
  detail: z.string(),
  pointer: z.string().optional(),
  given: z.json().optional(),
  allowed: z.json().optional(),
  limit: z.enum(PROBLEM_LIMITS).optional(),
  errors: z.array(fieldProblemRule),
  nearest: z.array(nearestRule),
  instance: z.string().optional(),
});

export interface FieldProblem {
  readonly code: ProblemCode;
  /** RFC 6901, relative to the request body (REST) or to the argument `input` (GraphQL). */
  readonly pointer: string;
  readonly detail: string;
  readonly given?: unknown;
  readonly allowed?: unknown;
}

export interface NearestChange {
  readonly pointer: string;
  readonly given: unknown;
  /** null: leave the member out. */
  readonly works: unknown;
  readonly unit?: string;
}

/** One way out: the changes, and the whole body with them made, ready to be sent again. */
export interface Nearest {
  readonly reason: string;
  readonly changes: readonly NearestChange[];
  readonly input: unknown;
}

export interface Problem {
  /** URI reference, served by this service: `/problems/<slug>`. */
  readonly type: string;
  readonly title: string;
  readonly status: number;
  readonly code: ProblemCode;
  readonly detail: string;
  readonly pointer?: string;
  readonly given?: unknown;
  readonly allowed?: unknown;
  readonly limit?: ProblemLimit;
  readonly errors: readonly FieldProblem[];
  readonly nearest: readonly Nearest[];
  readonly instance?: string;
}
