/** Errors as they leave: a problem in `extensions`, the same members as everywhere; of a defect only an id. */
import type { GraphQLError, GraphQLFormattedError } from 'graphql';
import { pointerOf } from '../../schema/pointer.ts';
import type { FieldProblem, Problem } from '../../schema/problem.ts';
import { badInput, ProblemError, problemOf, problemOfUnknown } from '../errors.ts';
import type { Places } from './pointers.ts';

export interface ErrorBody extends Omit<GraphQLFormattedError, 'extensions'> {
  readonly extensions: Problem;
}

/** Told about what nobody foresaw. */
export type LogDefect = (error: unknown, problem: Problem) => void;

/**
 * A whole request that was not run. Faults of the document itself are told apart: a client that accepts only
 * `application/json` gets them with status 200 (GraphQL over HTTP, as the audits of graphql-http 1.23.1 have it).
 */
export class RequestRefused extends Error {
  override readonly name = 'RequestRefused';
  constructor(
    readonly errors: readonly ErrorBody[],
    readonly isFaultOfDocument: boolean,
  ) {
    super(errors[0]?.message ?? 'refused');
  }
}

type Place = Pick<GraphQLError, 'locations' | 'path'>;

export function bodyOf(problem: Problem, { locations, path }: Partial<Place> = {}): ErrorBody {
  return {
    message: problem.detail,
    ...(locations ? { locations } : {}),
    ...(path ? { path } : {}),
    extensions: problem,
  };
}

/** A syntax or validation error of graphql itself. */
export function bodyOfDocumentError(error: GraphQLError, places: Places | null): ErrorBody {
  const paths = (error.nodes ?? []).map((node) => places?.ofNode(node) ?? null);
  const path = paths.find((one) => one !== null);
  const more = path === undefined ? {} : { pointer: pointerOf(path) };
  return bodyOf(problemOf('BAD_INPUT', error.message, more), error);
}

/** Values of variables that do not fit their types, as one problem. */
export function bodyOfFields(fields: readonly FieldProblem[]): ErrorBody {
  const first = fields[0]!;
  const { problem } = badInput(first.detail, {
    pointer: first.pointer,
    ...(first.given === undefined ? {} : { given: first.given }),
    errors: fields.length > 1 ? fields : [],
  });
  return bodyOf(problem);
}

/** The problem of anything thrown on the way, whatever wraps it; what is none is a defect. */
export function problemErrorOf(error: unknown, log: LogDefect): ProblemError {
  let cause = error;
  // graphql wraps what resolvers throw; two layers where jit passes an error on.
  while (cause instanceof Error && !(cause instanceof ProblemError)) {
    const original: unknown = Reflect.get(cause, 'originalError');
    if (!(original instanceof Error)) break;
    cause = original;
  }
  const refusal = problemOfUnknown(cause);
  if (refusal.status >= 500) log(refusal.cause ?? cause, refusal.problem);
  return refusal;
}

/** The errors of anything that kept a request from being run. */
export function bodiesOf(error: unknown, log: LogDefect): readonly ErrorBody[] {
  if (error instanceof RequestRefused) return error.errors;
  return [bodyOf(problemErrorOf(error, log).problem)];
}
