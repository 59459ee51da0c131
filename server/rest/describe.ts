/** What the OpenAPI document says of a route, made from the same zod rules that check it. */
import type { FastifySchema } from 'fastify';
import { z } from 'zod';
import {
  fieldProblemRule,
  nearestChangeRule,
  nearestRule,
  type Problem,
  type ProblemCode,
  problemRule,
} from '../../schema/problem.ts';
import { problemOf } from '../errors.ts';
import { PROBLEM_TYPE } from './frame/index.ts';

/** Components of the document: rules that are referred to by name. */
export const documentedRules = z.registry<{ id: string }>();

const anything = z.unknown();
/** The rule of problems with "any JSON" said plainly: the recursive rule of it has no name in the document. */
export const problemAnswer = problemRule.extend({
  given: anything.optional(),
  allowed: anything.optional(),
  errors: z.array(fieldProblemRule.extend({ given: anything.optional(), allowed: anything.optional() })),
  nearest: z.array(
    nearestRule.extend({
      changes: z.array(nearestChangeRule.extend({ given: anything, works: anything })),
      input: anything,
    }),
  ),
});
documentedRules.add(problemAnswer, { id: 'Problem' });

export interface Answer {
  readonly about: string;
  /** Media type → rule; absent: no content. */
  readonly content?: Readonly<Record<string, z.ZodType>>;
}

export interface RouteDocument {
  readonly tag: string;
  readonly summary: string;
  readonly about?: string;
  readonly params?: z.ZodType;
  readonly query?: z.ZodType;
  readonly body?: z.ZodType;
  /** Request headers that mean something here, beside Authorization. */
  readonly headers?: Readonly<Record<string, string>>;
  readonly answers: Readonly<Record<number, Answer>>;
  /** Beyond those that every route has. */
  readonly problems?: readonly ProblemCode[];
  readonly isPublic?: boolean;
}

const EVERYWHERE: readonly ProblemCode[] = ['BAD_INPUT', 'INTERNAL', 'SERVICE_UNAVAILABLE'];
const WITH_TOKEN: readonly ProblemCode[] = ['UNAUTHENTICATED', 'FORBIDDEN', 'RATE_LIMITED'];

function problemAnswers(codes: readonly ProblemCode[]): Record<number, object> {
  const byStatus = new Map<number, Problem[]>();
  for (const code of new Set(codes)) {
    const problem = problemOf(code, '');
    byStatus.set(problem.status, [...(byStatus.get(problem.status) ?? []), problem]);
  }
  const answers: Record<number, object> = {};
  for (const [status, problems] of byStatus) {
    answers[status] = {
      description: problems.map(({ code, title }) => `${code}: ${title}.`).join(' '),
      content: { [PROBLEM_TYPE]: { schema: problemAnswer } },
    };
  }
  return answers;
}

function goodAnswers(answers: Readonly<Record<number, Answer>>): Record<number, object> {
  return Object.fromEntries(
    Object.entries(answers).map(([status, { about, content }]) => {
      // The document's maker takes a null schema to mean that there is no content.
      if (!content) return [status, z.null().describe(about)];
      const media = Object.entries(content).map(([type, schema]) => [type, { schema }]);
      return [status, { description: about, content: Object.fromEntries(media) }];
    }),
  );
}

function headersRule(headers: Readonly<Record<string, string>>): z.ZodType {
  const members = Object.entries(headers).map(([name, about]) => [
    name,
    z.string().optional().describe(about),
  ]);
  return z.object(Object.fromEntries(members) as Record<string, z.ZodType>);
}

export function describe(document: RouteDocument): FastifySchema {
  const { params, query, body, headers, problems = [], isPublic = false } = document;
  const codes = [...EVERYWHERE, ...(isPublic ? [] : WITH_TOKEN), ...problems];
  return {
    tags: [document.tag],
    summary: document.summary,
    ...(document.about === undefined ? {} : { description: document.about }),
    ...(params ? { params } : {}),
    ...(query ? { querystring: query } : {}),
    ...(body ? { body } : {}),
    ...(headers ? { headers: headersRule(headers) } : {}),
    security: isPublic ? [] : [{ bearer: [] }],
    response: { ...goodAnswers(document.answers), ...problemAnswers(codes) },
  } as FastifySchema;
}

export const WAIT_HEADER = {
  prefer:
    '`wait=N` (RFC 7240): wait up to N seconds, at most 60; `Preference-Applied` says what was granted.',
};
export const IDEMPOTENCY_HEADER = {
  'idempotency-key':
    '1 to 128 visible characters. The same key with the same body answers the same record again.',
};
export const CONDITIONAL_HEADERS = {
  'if-none-match': 'Entity tag that is known already: 304 while it is still the present one.',
};
