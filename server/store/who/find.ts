import { validate as isUuid } from 'uuid';
import { type Database, one, type Transaction } from '../database.ts';
import type { TokenRecord } from '../records.ts';
import type { Who } from '../store.ts';
import { TOKEN_FROM, type TokenRow, tokenOf } from './columns.ts';

/** On the way of every request that is not cached: prepared. */
export const findToken =
  (database: Database): Who['findToken'] =>
  async (lookup) => {
    const row = await one<TokenRow>(database.pool, {
      name: 'find-token',
      text: `${TOKEN_FROM} where t.lookup = $1`,
      values: [lookup],
    });
    return row && tokenOf(row);
  };

export async function readToken(on: Database['pool'] | Transaction, id: string): Promise<TokenRecord | null> {
  const row = await one<TokenRow>(on, `${TOKEN_FROM} where t.id = $1`, [id]);
  return row && tokenOf(row);
}

export const findTokenById =
  (database: Database): Who['findTokenById'] =>
  async (id) =>
    isUuid(id) ? readToken(database.pool, id) : null;

export const listTokens =
  (database: Database): Who['listTokens'] =>
  async () => {
    const { rows } = await database.pool.query<TokenRow>(
      `${TOKEN_FROM} order by t.created_at desc, t.id desc`,
    );
    return rows.map(tokenOf);
  };

export const findActors =
  (database: Database): Who['findActors'] =>
  async (ids) => {
    const rows = await database.prisma.actor.findMany({
      where: { id: { in: ids.filter((id) => isUuid(id)) } },
    });
    return rows.map((row) => ({ ...row, kind: row.kind as 'PERSON' | 'INSTRUMENT' | 'SYSTEM' }));
  };
