/** The error that carries a problem. */
import type { Problem, ProblemCode } from '../schema/problem.ts';
import { PROBLEM_TABLE, typeOf } from './problem-table.ts';

export class ProblemError extends Error {
  override readonly name = 'ProblemError';
  constructor(
    readonly problem: Problem,
    /** HTTP headers that belong to the answer, in lower case. */
    readonly headers: Readonly<Record<string, string>> = {},
    options?: ErrorOptions,
  ) {
    super(problem.detail, options);
  }

  get status(): number {
    return this.problem.status;
  }
}

export type ProblemMembers = Partial<Omit<Problem, 'type' | 'title' | 'status' | 'code' | 'detail'>>;

export function problemOf(code: ProblemCode, detail: string, more: ProblemMembers = {}): Problem {
  const { status, title } = PROBLEM_TABLE[code];
  return { type: typeOf(code), title, status, code, detail, errors: [], nearest: [], ...more };
}

export function refuse(
  code: ProblemCode,
  detail: string,
  more: ProblemMembers = {},
  headers: Readonly<Record<string, string>> = {},
): ProblemError {
  return new ProblemError(problemOf(code, detail, more), headers);
}
