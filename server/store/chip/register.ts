import { v7 as newId } from 'uuid';
import { type Database, inTransaction, one } from '../database.ts';
import { writeHistory } from '../history/write.ts';
import { claimKey, settleKey } from '../idempotency.ts';
import type { ChipRecord } from '../records.ts';
import type { Chips } from '../store.ts';
import { CHIP_COLUMNS } from './columns.ts';

export const registerChip =
  (database: Database): Chips['registerChip'] =>
  (by, ask, idempotency) =>
    inTransaction(database, async (tx, undo) => {
      const claim = await claimKey(tx, by, idempotency);
      if (claim.kind === 'REUSED') return undo({ outcome: 'KEY_REUSED' });
      const id = claim.kind === 'REPLAY' ? claim.subjectId : newId();
      if (claim.kind === 'NEW') {
        const made = await tx.query(
          `insert into chip (id, serial, description, head_revision, created_by) values ($1, $2, $3, 1, $4)
           on conflict (serial) do nothing`,
          [id, ask.serial, ask.description, by.actorId],
        );
        if (made.rowCount === 0) return undo({ outcome: 'NAME_TAKEN' });
        await tx.query(
          `insert into chip_revision (id, chip_id, number, hash, canonical, created_by) values ($1, $2, 1, $3, $4, $5)`,
          [newId(), id, ask.hash, ask.canonical, by.actorId],
        );
        await writeHistory(tx, by, {
          action: 'chip.registered',
          subjectKind: 'Chip',
          subjectId: id,
          chipId: id,
          detail: { serial: ask.serial },
        });
        await settleKey(tx, by, idempotency, id);
      }
      const record = await one<ChipRecord>(tx, `select ${CHIP_COLUMNS} from chip where id = $1`, [id]);
      if (!record) throw new Error('a chip just written is not there');
      return { outcome: 'WRITTEN', record, replayed: claim.kind === 'REPLAY' };
    });
