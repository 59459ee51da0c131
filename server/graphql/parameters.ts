/** The members of a GraphQL request, by POST, by GET and over WebSocket. */
import type { FastifyRequest } from 'fastify';
import { badInput, type ProblemError } from '../errors.ts';
import { jsonSafe } from '../problem-of-zod.ts';
import { JsonRefused, readJson } from '../rest/index.ts';
import type { GraphqlRequest } from './prepare.ts';

type Members = Readonly<Record<string, unknown>>;

function isMembers(value: unknown): value is Members {
  return typeof value === 'object' && value !== null && !Array.isArray(value);
}

function wrong(name: string, what: string, given: unknown): ProblemError {
  const detail = `/${name} must be ${what}.`;
  return badInput(detail, {
    pointer: `/${name}`,
    ...(given === undefined ? {} : { given: jsonSafe(given) }),
  });
}

/** Absent and null are the same. Members that are not ours are ignored, as the specification has it. */
export function readMembers(members: unknown): GraphqlRequest {
  if (Array.isArray(members)) throw badInput('Send one operation a request: batches are not taken.');
  if (!isMembers(members)) throw badInput('The request must be an object with the member query.');
  const { query, operationName = null, variables = null, extensions = null } = members;
  if (typeof query !== 'string') throw wrong('query', 'a string: the GraphQL document', query);
  if (operationName !== null && typeof operationName !== 'string') {
    throw wrong('operationName', 'a string', operationName);
  }
  if (variables !== null && !isMembers(variables)) throw wrong('variables', 'an object', variables);
  if (extensions !== null && !isMembers(extensions)) throw wrong('extensions', 'an object', extensions);
  return { query, operationName, variables: variables ?? {} };
}

/** Objects in a query string are JSON text. */
function fromQueryString(name: string, text: unknown): unknown {
  if (text === undefined || text === '') return undefined;
  try {
    return readJson(String(text));
  } catch (error) {
    if (!(error instanceof JsonRefused)) throw error;
    throw wrong(name, `an object, written as JSON: ${error.message}`, text);
  }
}

export function readGraphqlRequest(request: FastifyRequest): GraphqlRequest {
  if (request.method === 'POST') return readMembers(request.body);
  const { query, operationName, variables, extensions } = request.query as Members;
  return readMembers({
    query,
    operationName: operationName === '' ? undefined : operationName,
    variables: fromQueryString('variables', variables),
    extensions: fromQueryString('extensions', extensions),
  });
}
