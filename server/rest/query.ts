/** Query strings and paths: text that becomes numbers and truth values once, here, by a rule that also documents it. */
import type { FastifyRequest } from 'fastify';
import { z } from 'zod';
import { LIMITS } from '../../schema/limits.ts';
import { badInput, problemOfZod } from '../errors.ts';

export const numberQuery = z.coerce.number();
export const booleanQuery = z.enum(['true', 'false']).transform((text) => text === 'true');
const textQuery = z.string().max(1000);

export const pageQuery = {
  first: numberQuery
    .int()
    .min(0)
    .max(LIMITS.pageSize)
    .optional()
    .describe(`Entries of the page; ${LIMITS.defaultPageSize} when absent.`),
  after: textQuery.optional().describe('Cursor of the last entry seen.'),
};

/**
 * The query by its rule. Empty and repeated parameters are refused: `?first=` would count as 0, and of two values one
 * would be lost. Throws BAD_INPUT, pointers name the parameter.
 */
export function readQuery<S extends z.ZodRawShape>(
  request: FastifyRequest,
  rule: z.ZodObject<S>,
): z.output<z.ZodObject<S>> {
  const given = { ...(request.query as Record<string, string | string[]>) };
  for (const [name, value] of Object.entries(given)) {
    const reason = Array.isArray(value) ? 'is given more than once' : value === '' ? 'is empty' : null;
    if (reason)
      throw badInput(`The query parameter ${name} ${reason}.`, { pointer: `/${name}`, given: value });
  }
  const read = rule.safeParse(given);
  if (!read.success) throw problemOfZod(read.error, given);
  return read.data;
}

/** Of a list: page, order and everything else as the filter. */
export function listAskOf(query: Readonly<Record<string, unknown>>) {
  const { first, after, order, ...filter } = query;
  return { first, after, order, filter };
}

/**
 * The body with what stands in the path and in headers put in, for operations take one input. A body that repeats such
 * a member must agree. A body that is no object goes on as it is and is refused by its rule.
 */
export function withMembers(body: unknown, members: Readonly<Record<string, unknown>>): unknown {
  if (typeof body !== 'object' || body === null || Array.isArray(body)) return body;
  const given = body as Record<string, unknown>;
  for (const [name, value] of Object.entries(members)) {
    const own = given[name];
    if (own === undefined || own === null || own === value) continue;
    throw badInput(
      `/${name} says ${JSON.stringify(own)}, the URL or a header says ${JSON.stringify(value)}.`,
      {
        pointer: `/${name}`,
        given: own,
        allowed: value,
      },
    );
  }
  const present = Object.entries(members).filter(([, value]) => value !== undefined);
  return { ...given, ...Object.fromEntries(present) };
}
