import { validate as isUuid } from 'uuid';
import { type Database, one, type Transaction } from '../database.ts';
import { pageOf, readAfter, select } from '../page.ts';
import type { RequestRecord } from '../records.ts';
import type { Designs } from '../store.ts';

/** `real` reads back as the shortest text that gives the same four bytes, so 0.4 stays 0.4. */
const REQUEST_FROM = `select r.id, r.kind, r.chip_id as "chipId", r.chip_revision_id as "chipRevisionId", r.asked, r.key,
    r.computation_id as "computationId", r.design_id as "designId", r.state,
    case when r.state = 'DONE' then 1 else coalesce(c.progress, 0) end as progress, r.problem,
    r.created_at as "createdAt", r.created_by as "createdBy", r.finished_at as "finishedAt"
  from request r left join computation c on c.id = r.computation_id`;

export function readRequest(on: Database['pool'] | Transaction, id: string): Promise<RequestRecord | null> {
  return one<RequestRecord>(on, {
    name: 'find-request',
    text: `${REQUEST_FROM} where r.id = $1`,
    values: [id],
  });
}

export const findRequest =
  (database: Database): Designs['findRequest'] =>
  async (id) =>
    isUuid(id) ? readRequest(database.pool, id) : null;

export const listRequests =
  (database: Database): Designs['listRequests'] =>
  async (filter, page) => {
    const rows = select(database, REQUEST_FROM);
    if (filter.chipId !== undefined) rows.and('r.chip_id = ?', filter.chipId);
    if (filter.states !== undefined) rows.and('r.state = any(?)', filter.states);
    if (filter.createdBy !== undefined) rows.and('r.created_by = ?', filter.createdBy);
    const after = readAfter(page, 'time', 'uuid');
    if (after) rows.and('(r.created_at, r.id) < (?::timestamptz, ?::uuid)', after[0], after[1]);
    const read = await rows.read<RequestRecord>('r.created_at desc, r.id desc', page.first);
    return pageOf(read, page.first, (row) => [row.createdAt.toISOString(), row.id]);
  };
