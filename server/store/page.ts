/** Keyset pages: where the last row seen stood, not how many to skip, so a page costs the same at any depth. */
import type pg from 'pg';
import { validate as isUuid } from 'uuid';
import type { Database } from './database.ts';
import type { Page, PageAsk } from './records.ts';

/** A sort key that this list never gave out. */
export class InvalidSortKey extends Error {
  override readonly name = 'InvalidSortKey';
}

/** As toISOString writes it. */
const ISO_TIME = /^\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d\.\d{3}Z$/;

const KINDS = {
  time: (value: unknown) =>
    typeof value === 'string' && ISO_TIME.test(value) && !Number.isNaN(Date.parse(value)),
  uuid: (value: unknown) => typeof value === 'string' && isUuid(value),
  hash: (value: unknown) => typeof value === 'string' && /^[0-9a-f]{64}$/.test(value),
  name: (value: unknown) => typeof value === 'string' && /^[A-Za-z0-9._-]{1,64}$/.test(value),
  count: (value: unknown) => Number.isInteger(value) && Math.abs(value as number) < 2 ** 31,
  bigCount: (value: unknown) => typeof value === 'string' && /^\d{1,18}$/.test(value),
  numberOrNull: (value: unknown) => value === null || Number.isFinite(value),
} as const;

export type SortKey = readonly (string | number | null)[];

/** Checks a sort key that came back from outside. */
export function readAfter(page: PageAsk, ...kinds: readonly (keyof typeof KINDS)[]): SortKey | null {
  if (page.after === undefined) return null;
  const after = page.after;
  if (after.length !== kinds.length || !kinds.every((kind, index) => KINDS[kind](after[index]))) {
    throw new InvalidSortKey('not a position in this list');
  }
  return after;
}

/** One row more than asked for was read, to know whether there is a next page. */
export function pageOf<T>(rows: readonly T[], first: number, sortKey: (row: T) => SortKey): Page<T> {
  return {
    rows: rows.slice(0, first).map((row) => ({ row, sortKey: sortKey(row) })),
    hasNextPage: rows.length > first,
  };
}

/** A statement that grows: `?` in a condition stands for the next of its values. */
export interface Selection {
  and(condition: string, ...values: readonly unknown[]): void;
  read<T extends pg.QueryResultRow>(order: string, first: number): Promise<readonly T[]>;
}

export function select(database: Database, from: string): Selection {
  const conditions: string[] = [];
  const bound: unknown[] = [];
  return {
    and(condition, ...values) {
      let next = 0;
      conditions.push(
        condition.replace(/\?/g, () => {
          bound.push(values[next++]);
          return `$${bound.length}`;
        }),
      );
    },
    async read<T extends pg.QueryResultRow>(order: string, first: number) {
      const where = conditions.length === 0 ? '' : ` where ${conditions.join(' and ')}`;
      const text = `${from}${where} order by ${order} limit $${bound.length + 1}`;
      return (await database.pool.query<T>(text, [...bound, first + 1])).rows;
    },
  };
}
