import { validate as isUuid } from 'uuid';
import type { ChipModelInput } from '../../../schema/chip.ts';
import type { Database } from '../database.ts';
import { pageOf, readAfter } from '../page.ts';
import type { ChipRevisionRecord } from '../records.ts';
import type { Chips } from '../store.ts';

/** `canonical` is for the hash alone and twice the size of the model. */
const REVISION = { omit: { canonical: true } } as const;

function revisionOf<T extends { model: unknown }>(row: T): Omit<T, 'model'> & { model: ChipModelInput } {
  return { ...row, model: row.model as ChipModelInput };
}

export const findChip =
  (database: Database): Chips['findChip'] =>
  (serial) =>
    database.prisma.chip.findUnique({ where: { serial } });

export const findChipById =
  (database: Database): Chips['findChipById'] =>
  async (id) =>
    isUuid(id) ? database.prisma.chip.findUnique({ where: { id } }) : null;

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
