import { v7 as newId } from 'uuid';
import { type Database, inTransaction, one, type Transaction } from '../database.ts';
import { writeHistory } from '../history/write.ts';
import { claimKey, settleKey } from '../idempotency.ts';
import type { ChipRevisionRecord } from '../records.ts';
import type { Chips } from '../store.ts';
import { REVISION_COLUMNS } from './columns.ts';

function readRevision(tx: Transaction, where: string, values: unknown[]): Promise<ChipRevisionRecord | null> {
  return one<ChipRevisionRecord>(tx, `select ${REVISION_COLUMNS} from chip_revision where ${where}`, values);
}

/** The chip row is locked first: a save or publish that looks at the head waits, and then sees the new one. */
export const reviseChip =
  (database: Database): Chips['reviseChip'] =>
  (by, ask, idempotency) =>
    inTransaction(database, async (tx, undo) => {
      const { chipId, expectedRevision } = ask;
      const claim = await claimKey(tx, by, idempotency);
      if (claim.kind === 'REUSED') return undo({ outcome: 'KEY_REUSED' });
      if (claim.kind === 'REPLAY') {
        const record = await readRevision(tx, 'id = $1', [claim.subjectId]);
        if (!record) throw new Error('the revision that a key names is not there');
        return { outcome: 'WRITTEN', record, replayed: true };
      }
      const chip = await one<{ head: number }>(
        tx,
        'select head_revision as head from chip where id = $1 for update',
        [chipId],
      );
      if (!chip) throw new Error(`no chip ${chipId}`);
      if (chip.head !== expectedRevision) return undo({ outcome: 'STALE', headRevision: chip.head });
      const head = await readRevision(tx, 'chip_id = $1 and number = $2', [chipId, chip.head]);
      if (head && head.hash === ask.canonicalOf(chip.head).hash) {
        await settleKey(tx, by, idempotency, head.id);
        return { outcome: 'WRITTEN', record: head, replayed: false };
      }
      const number = chip.head + 1;
      const { canonical, hash } = ask.canonicalOf(number);
      const id = newId();
      await tx.query(
        `insert into chip_revision (id, chip_id, number, hash, canonical, note, created_by)
         values ($1, $2, $3, $4, $5, $6, $7)`,
        [id, chipId, number, hash, canonical, ask.note, by.actorId],
      );
      await tx.query('update chip set head_revision = $2 where id = $1', [chipId, number]);
      await writeHistory(tx, by, {
        action: 'chip.revised',
        subjectKind: 'ChipRevision',
        subjectId: id,
        chipId,
        detail: { number, note: ask.note },
      });
      await settleKey(tx, by, idempotency, id);
      const record = await readRevision(tx, 'id = $1', [id]);
      if (!record) throw new Error('a revision just written is not there');
      return { outcome: 'WRITTEN', record, replayed: false };
    });
