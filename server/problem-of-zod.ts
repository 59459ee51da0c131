/** What a zod rule found wrong with a body, as a problem: pointers, what was given, what is allowed, the way out. */
import type { z } from 'zod';
import { pointerOf, valueAt, withEdits } from '../schema/pointer.ts';
import type { FieldProblem, Nearest, NearestChange, ProblemCode, ProblemLimit } from '../schema/problem.ts';
import { type ProblemError, refuse } from './problem-error.ts';

type Issue = z.core.$ZodIssue;

/** What a rule's own checks put into `params` of an issue. */
interface CheckParams {
  readonly code?: ProblemCode;
  readonly allowed?: unknown;
  readonly limit?: ProblemLimit;
  readonly fix?: Fix;
}

/** How one issue is mended: another value, possibly in another member beside the one at the issue's path. */
interface Fix {
  readonly reason: string;
  readonly member?: string;
  readonly works: unknown;
  readonly unit?: string;
}

/** Longest `given` that is repeated whole. */
const GIVEN_CHARACTERS = 1_000;

/** A value as JSON can carry it: non-finite numbers by name, anything long by its size. */
export function jsonSafe(value: unknown): unknown {
  if (typeof value === 'number' && !Number.isFinite(value)) return String(value);
  const text = JSON.stringify(value, (_, v) =>
    typeof v === 'number' && !Number.isFinite(v) ? String(v) : v,
  );
  if (text === undefined) return undefined;
  return text.length > GIVEN_CHARACTERS ? `(${text.length} characters)` : JSON.parse(text);
}

function paramsOf(issue: Issue): CheckParams {
  return issue.code === 'custom' ? ((issue.params ?? {}) as CheckParams) : {};
}

/** Ranges and contradictions inside the specification have a code of their own; shapes and types do not. */
function codeOf(issue: Issue): ProblemCode {
  const own = paramsOf(issue).code;
  if (own !== undefined) return own;
  const ranged = issue.code === 'too_small' || issue.code === 'too_big';
  return ranged && issue.path[0] === 'specification' ? 'SPECIFICATION_INVALID' : 'BAD_INPUT';
}

const SIZES: Readonly<Record<string, string>> = { string: ' characters', array: ' entries', set: ' entries' };

function kindOf(value: unknown): string {
  if (value === null) return 'null';
  if (Array.isArray(value)) return 'a list';
  if (typeof value === 'number') return String(value);
  return typeof value === 'object' ? 'an object' : `a ${typeof value}`;
}

const EXPECTED: Readonly<Record<string, string>> = {
  number: 'a finite number',
  int: 'a whole number',
  string: 'a string',
  boolean: 'true or false',
  array: 'a list',
  object: 'an object',
};

function ruleOf(issue: Issue, given: unknown): { text: string; allowed?: unknown } {
  switch (issue.code) {
    case 'invalid_type': {
      const expected = EXPECTED[issue.expected] ?? issue.expected;
      const allowed = { type: issue.expected };
      if (given === undefined) return { text: `is missing; it must be ${expected}`, allowed };
      return { text: `must be ${expected}, not ${kindOf(given)}`, allowed };
    }
    case 'too_small': {
      const exact = issue.exact === true;
      const limit = Number(issue.minimum);
      const bound = exact ? 'exactly' : issue.inclusive ? 'at least' : 'more than';
      const name = exact ? 'exactly' : issue.inclusive ? 'min' : 'above';
      const verb = SIZES[issue.origin] === undefined ? 'be' : 'have';
      return {
        text: `must ${verb} ${bound} ${limit}${SIZES[issue.origin] ?? ''}`,
        allowed: { [name]: limit },
      };
    }
    case 'too_big': {
      const exact = issue.exact === true;
      const limit = Number(issue.maximum);
      const bound = exact ? 'exactly' : issue.inclusive ? 'at most' : 'less than';
      const name = exact ? 'exactly' : issue.inclusive ? 'max' : 'below';
      const verb = SIZES[issue.origin] === undefined ? 'be' : 'have';
      return {
        text: `must ${verb} ${bound} ${limit}${SIZES[issue.origin] ?? ''}`,
        allowed: { [name]: limit },
      };
    }
    case 'invalid_value':
      return { text: `must be one of ${issue.values.join(', ')}`, allowed: issue.values };
    default:
      return { text: issue.message };
  }
}

function fieldsOf(issue: Issue, body: unknown): FieldProblem[] {
  if (issue.code === 'unrecognized_keys') {
    return issue.keys.map((key) => {
      const path = [...issue.path, key];
      const detail = `${pointerOf(path)} is not a member that anything reads.`;
      return fieldOf('BAD_INPUT', path, detail, valueAt(body, path), undefined);
    });
  }
  const given = valueAt(body, issue.path);
  const { text, allowed } = ruleOf(issue, given);
  const subject = issue.path.length === 0 ? 'The request' : pointerOf(issue.path);
  return [
    fieldOf(codeOf(issue), issue.path, `${subject} ${text}.`, given, paramsOf(issue).allowed ?? allowed),
  ];
}

function fieldOf(
  code: ProblemCode,
  path: readonly PropertyKey[],
  detail: string,
  given: unknown,
  allowed: unknown,
): FieldProblem {
  return {
    code,
    pointer: pointerOf(path),
    detail,
    ...(given === undefined ? {} : { given: jsonSafe(given) }),
    ...(allowed === undefined ? {} : { allowed }),
  };
}

function changesOf(issue: Issue, fix: Fix, body: unknown): NearestChange[] {
  const pointer = pointerOf(issue.path);
  const given = valueAt(body, issue.path) ?? null;
  const { member, works, unit } = fix;
  const inUnit = unit === undefined ? {} : { unit };
  const target = member === undefined ? pointer : pointerOf([...issue.path.slice(0, -1), member]);
  if (target === pointer) return [{ pointer, given, works, ...inUnit }];
  return [
    { pointer, given, works: null },
    { pointer: target, given: null, works, ...inUnit },
  ];
}

/** All issues mended at once, if each of them knows how and the result is accepted. */
function nearestOf(issues: readonly Issue[], body: unknown, accepts: (input: unknown) => boolean): Nearest[] {
  const fixes = issues.flatMap((issue) => {
    const { fix } = paramsOf(issue);
    return fix === undefined ? [] : [{ issue, fix }];
  });
  if (fixes.length < issues.length) return [];
  const changes = fixes.flatMap(({ issue, fix }) => changesOf(issue, fix, body));
  const input = withEdits(body, changes);
  if (!accepts(input)) return [];
  const reasons = [...new Set(fixes.map(({ fix }) => fix.reason))];
  return [{ reason: reasons.join('; '), changes, input }];
}

/**
 * @param body what arrived, before any rule changed it
 * @param accepts whether a mended body would pass (at least the same rule)
 */
export function problemOfZod(
  error: z.core.$ZodError,
  body: unknown,
  accepts: (input: unknown) => boolean = () => true,
): ProblemError {
  const fields = error.issues.flatMap((issue) => fieldsOf(issue, body));
  const first =
    fields[0] ?? fieldOf('BAD_INPUT', [], 'The request is not well formed.', undefined, undefined);
  const limit = error.issues[0] && paramsOf(error.issues[0]).limit;
  const more = fields.length > 1 ? ` (${fields.length} things are wrong; see errors)` : '';
  return refuse(first.code, first.detail.replace(/\.$/, `${more}.`), {
    pointer: first.pointer,
    ...(first.given === undefined ? {} : { given: first.given }),
    ...(first.allowed === undefined ? {} : { allowed: first.allowed }),
    ...(limit === undefined ? {} : { limit }),
    errors: fields.length > 1 ? fields : [],
    nearest: nearestOf(error.issues, body, accepts),
  });
}
