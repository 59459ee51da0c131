import type { Problem } from '../../../schema/problem.ts';
import { type Database, one, type Transaction } from '../database.ts';
import type { DesignRecord } from '../records.ts';
import type { Designs } from '../store.ts';

export const DESIGN_FROM = `select id, canonical, chip_id as "chipId", chip_revision_id as "chipRevisionId", engine, family,
    architecture, filter_order as "filterOrder", met, worst_margin_db as "worstMarginDb",
    insertion_loss_db as "insertionLossDb", rejection_db as "rejectionDb", result, result_hash as "resultHash",
    created_at as "createdAt"
  from design`;

/** What answers a repeated question: one prepared select by address. */
export function readDesign(on: Database['pool'] | Transaction, id: string): Promise<DesignRecord | null> {
  return one<DesignRecord>(on, { name: 'find-design', text: `${DESIGN_FROM} where id = $1`, values: [id] });
}

export async function readRefusal(on: Database['pool'] | Transaction, id: string): Promise<Problem | null> {
  const row = await one<{ problem: Problem }>(on, {
    name: 'find-refusal',
    text: 'select problem from refusal where id = $1',
    values: [id],
  });
  return row?.problem ?? null;
}

export const findDesign =
  (database: Database): Designs['findDesign'] =>
  (id) =>
    readDesign(database.pool, id);

export const findRefusal =
  (database: Database): Designs['findRefusal'] =>
  (id) =>
    readRefusal(database.pool, id);

export const findDesigns =
  (database: Database): Designs['findDesigns'] =>
  async (ids) =>
    (await database.pool.query<DesignRecord>(`${DESIGN_FROM} where id = any($1::text[])`, [[...ids]])).rows;
