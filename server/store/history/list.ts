/**
 * Newest first, by id. Ids are given out before their transactions commit, so an entry may appear below one already
 * read; a reader that must miss none (a copy, a seal) takes only rows with `tx < pg_snapshot_xmin(pg_current_snapshot())`.
 */
import type { Database } from '../database.ts';
import { pageOf, readAfter, select } from '../page.ts';
import type { ActorKind, HistoryRecord } from '../records.ts';
import type { History } from '../store.ts';

type Row = Omit<HistoryRecord, 'actor'> & {
  actorId: string;
  actorKind: ActorKind;
  actorName: string;
  actorCreatedAt: Date;
};

const FROM = `select h.id, h.at, h.token_id as "tokenId", h.action, h.subject_kind as "subjectKind",
    h.subject_id as "subjectId", h.chip_id as "chipId", h.detail,
    a.id as "actorId", a.kind as "actorKind", a.name as "actorName", a.created_at as "actorCreatedAt"
  from history h join actor a on a.id = h.actor_id`;

function recordOf({ actorId, actorKind, actorName, actorCreatedAt, ...rest }: Row): HistoryRecord {
  return { ...rest, actor: { id: actorId, kind: actorKind, name: actorName, createdAt: actorCreatedAt } };
}

export const listHistory =
  (database: Database): History['listHistory'] =>
  async (filter, page) => {
    const rows = select(database, FROM);
    if (filter.chipId !== undefined) rows.and('h.chip_id = ?', filter.chipId);
    if (filter.actorId !== undefined) rows.and('h.actor_id = ?', filter.actorId);
    if (filter.action !== undefined) rows.and('h.action = ?', filter.action);
    if (filter.after !== undefined) rows.and('h.at > ?', filter.after);
    if (filter.before !== undefined) rows.and('h.at < ?', filter.before);
    const after = readAfter(page, 'bigCount');
    if (after) rows.and('h.id < ?::bigint', after[0]);
    const read = await rows.read<Row>('h.id desc', page.first);
    return pageOf(read.map(recordOf), page.first, (row) => [row.id]);
  };

export const findHistoryEntry =
  (database: Database): History['findHistoryEntry'] =>
  async (id) => {
    if (!/^\d{1,18}$/.test(id)) return null;
    const { rows } = await database.pool.query<Row>(`${FROM} where h.id = $1::bigint`, [id]);
    return rows[0] ? recordOf(rows[0]) : null;
  };
