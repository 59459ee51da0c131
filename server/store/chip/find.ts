import { validate as isUuid } from 'uuid';
import type { ChipModelInput } from '../../../schema/chip.ts';
import { type Database, one } from '../database.ts';
import { pageOf, readAfter } from '../page.ts';
import type { ChipRecord, ChipRevisionRecord } from '../records.ts';
import type { Chips } from '../store.ts';

/** `canonical` is for the hash alone and twice the size of the model. */
const REVISION = { omit: { canonical: true } } as const;

function revisionOf<T extends { model: unknown }>(row: T): Omit<T, 'model'> & { model: ChipModelInput } {
  return { ...row, model: row.model as ChipModelInput };
}

/** In front of every repeated question: prepared, at less than half of what the client of the other look-ups costs. */
export const findChip =
  (database: Database): Chips['findChip'] =>
  (serial) =>
    one<ChipRecord>(database.pool, {
      name: 'find-chip',
      text: `select id, serial, description, head_revision as "headRevision", retired_at as "retiredAt",
          created_at as "createdAt", created_by as "createdBy"
        from chip where serial = $1`,
      values: [serial],
    });

export const findChipById =
  (database: Database): Chips['findChipById'] =>
  async (id) =>
    isUuid(id) ? database.prisma.chip.findUnique({ where: { id } }) : null;

const uuids = (ids: readonly string[]): string[] => ids.filter((id) => isUuid(id));

export const findChipsById =
  (database: Database): Chips['findChipsById'] =>
  (ids) =>
    database.prisma.chip.findMany({ where: { id: { in: uuids(ids) } } });

export const listChips =
  (database: Database): Chips['listChips'] =>
  async (page) => {
    const after = readAfter(page, 'name');
    const rows = await database.prisma.chip.findMany({
      ...(after && { where: { serial: { gt: String(after[0]) } } }),
      orderBy: { serial: 'asc' },
      take: page.first + 1,
    });
    return pageOf(rows, page.first, (row) => [row.serial]);
  };

export const findRevision =
  (database: Database): Chips['findRevision'] =>
  async (chipId, number): Promise<ChipRevisionRecord | null> => {
    const where = { chipId_number: { chipId, number } };
    const row = await database.prisma.chipRevision.findUnique({ where, ...REVISION });
    return row && revisionOf(row);
  };

export const findRevisionById =
  (database: Database): Chips['findRevisionById'] =>
  async (id) => {
    if (!isUuid(id)) return null;
    const row = await database.prisma.chipRevision.findUnique({ where: { id }, ...REVISION });
    return row && revisionOf(row);
  };

export const findRevisionsById =
  (database: Database): Chips['findRevisionsById'] =>
  async (ids) => {
    const rows = await database.prisma.chipRevision.findMany({
      where: { id: { in: uuids(ids) } },
      ...REVISION,
    });
    return rows.map(revisionOf);
  };

export const findHeadRevisions =
  (database: Database): Chips['findHeadRevisions'] =>
  async (chipIds) => {
    const { rows } = await database.pool.query<ChipRevisionRecord>(
      `select r.id, r.chip_id as "chipId", r.number, r.hash, r.model, r.note, r.created_at as "createdAt",
         r.created_by as "createdBy"
       from chip c join chip_revision r on r.chip_id = c.id and r.number = c.head_revision
       where c.id = any($1::uuid[])`,
      [uuids(chipIds)],
    );
    return rows;
  };

/** Newest first. */
export const listRevisions =
  (database: Database): Chips['listRevisions'] =>
  async (chipId, page) => {
    const after = readAfter(page, 'count');
    const rows = await database.prisma.chipRevision.findMany({
      where: { chipId, ...(after && { number: { lt: Number(after[0]) } }) },
      orderBy: { number: 'desc' },
      take: page.first + 1,
      ...REVISION,
    });
    return pageOf(rows.map(revisionOf), page.first, (row) => [row.number]);
  };
