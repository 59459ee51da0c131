/** One way to answer every list. */
import type { z } from 'zod';
import { LIMITS } from '../../schema/limits.ts';
import { pageRule } from '../../schema/page.ts';
import type { Page, PageAsk } from '../store/records.ts';
import { badCursor, decodeCursor, encodeCursor } from './cursor.ts';
import type { Connection, ListAsk } from './operations.ts';
import { readInput } from './read-input.ts';

/** The filter of a list by its rule; absent: no filter. Pointers are those of the list's arguments. */
export function readFilter<T>(ask: ListAsk, rule: z.ZodType<T>): T {
  return readInput(rule, ask.filter ?? {});
}

export interface List<R, T> {
  /** Which list this is, with its filter and order: what a cursor is bound to. */
  readonly context: Readonly<Record<string, unknown>>;
  readonly read: (page: PageAsk) => Promise<Page<R>>;
  readonly nodeOf: (row: R) => T | Promise<T>;
}

/** @throws ProblemError BAD_INPUT, BAD_CURSOR */
export async function connectionOf<R, T>(ask: ListAsk, list: List<R, T>): Promise<Connection<T>> {
  const { first = LIMITS.defaultPageSize, after } = readInput(pageRule, {
    first: ask.first,
    after: ask.after,
  });
  const sortKey = after === undefined ? undefined : decodeCursor(after, list.context);
  const page = await list
    .read({ first, ...(sortKey === undefined ? {} : { after: sortKey }) })
    .catch((error: unknown) => {
      // The store checks keys it gave out itself once more: a forged cursor is a wrong cursor.
      throw error instanceof Error && error.name === 'InvalidSortKey' ? badCursor(after) : error;
    });
  const edges = await Promise.all(
    page.rows.map(async ({ row, sortKey: key }) => ({
      cursor: encodeCursor(key, list.context),
      node: await list.nodeOf(row),
    })),
  );
  return {
    edges,
    pageInfo: {
      hasNextPage: page.hasNextPage,
      hasPreviousPage: after !== undefined,
      startCursor: edges[0]?.cursor ?? null,
      endCursor: edges.at(-1)?.cursor ?? null,
    },
  };
}
