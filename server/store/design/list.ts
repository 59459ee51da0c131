import type { Database } from '../database.ts';
import { pageOf, readAfter, select } from '../page.ts';
import type { DesignRecord } from '../records.ts';
import type { Designs } from '../store.ts';
import { DESIGN_FROM } from './find.ts';

/** As in the index `design_rejection`: what has no rejection comes last. */
const REJECTION = "coalesce(rejection_db, '-Infinity'::double precision)";

export const listDesigns =
  (database: Database): Designs['listDesigns'] =>
  async (filter, order, page) => {
    const rows = select(database, DESIGN_FROM);
    if (filter.chipId !== undefined) rows.and('chip_id = ?', filter.chipId);
    if (filter.family !== undefined) rows.and('family = ?', filter.family);
    if (filter.architecture !== undefined) rows.and('architecture = ?', filter.architecture);
    if (filter.met !== undefined) rows.and('met = ?', filter.met);
    if (filter.minRejectionDb !== undefined) rows.and('rejection_db >= ?', filter.minRejectionDb);
    if (filter.maxInsertionLossDb !== undefined)
      rows.and('insertion_loss_db <= ?', filter.maxInsertionLossDb);
    if (filter.createdAfter !== undefined) rows.and('created_at > ?', filter.createdAfter);
    if (filter.createdBefore !== undefined) rows.and('created_at < ?', filter.createdBefore);
    if (order === 'REJECTION') {
      const after = readAfter(page, 'numberOrNull', 'hash');
      if (after) {
        rows.and(`(${REJECTION}, id) < (coalesce(?::double precision, '-Infinity'), ?)`, after[0], after[1]);
      }
      const read = await rows.read<DesignRecord>(`${REJECTION} desc, id desc`, page.first);
      return pageOf(read, page.first, (row) => [row.rejectionDb, row.id]);
    }
    const after = readAfter(page, 'time', 'hash');
    if (after) rows.and('(created_at, id) < (?::timestamptz, ?)', after[0], after[1]);
    const read = await rows.read<DesignRecord>('created_at desc, id desc', page.first);
    return pageOf(read, page.first, (row) => [row.createdAt.toISOString(), row.id]);
  };
