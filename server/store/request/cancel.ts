import { validate as isUuid } from 'uuid';
import { type Database, inTransaction } from '../database.ts';
import { writeHistory } from '../history/write.ts';
import { notify } from '../notify.ts';
import type { Designs } from '../store.ts';
import { readRequest } from './find.ts';

/**
 * Ends one ask. The computation's row is locked first (as everywhere: computation, then request), so a request that
 * joins either came before and is counted, or waits and then makes a computation of its own.
 */
export const cancelRequest =
  (database: Database): Designs['cancelRequest'] =>
  (by, id) =>
    inTransaction(database, async (tx, undo) => {
      const before = isUuid(id) ? await readRequest(tx, id) : null;
      if (!before) return undo({ outcome: 'NOT_FOUND' });
      const { computationId } = before;
      await tx.query('select 1 from computation where id = $1 for update', [computationId]);
      const cancelled = await tx.query(
        `update request set state = 'CANCELLED', cancelled_by = $2, finished_at = now()
         where id = $1 and state in ('QUEUED','RUNNING')`,
        [id, by.actorId],
      );
      const record = await readRequest(tx, id);
      if (!record) throw new Error('a request just read is not there');
      if (cancelled.rowCount === 0) {
        if (record.state === 'CANCELLED') return { outcome: 'WRITTEN', record, replayed: true };
        return undo({ outcome: 'FINISHED', record });
      }
      const left = await tx.query<{ ended: boolean }>(
        `update computation set waiters = waiters - 1,
           state = case when waiters = 1 then 'CANCELLED' else state end,
           finished_at = case when waiters = 1 then now() end
         where id = $1 returning state = 'CANCELLED' as ended`,
        [computationId],
      );
      const ended = left.rows[0]?.ended === true;
      if (ended) await tx.query('select graphile_worker.remove_job($1::text)', [computationId]);
      await writeHistory(tx, by, {
        action: 'design.cancelled',
        subjectKind: 'DesignRequest',
        subjectId: id,
        chipId: record.chipId,
        detail: { key: record.key },
      });
      if (computationId !== null) await notify(tx, 'computation', computationId);
      if (computationId !== null && ended) await notify(tx, 'cancel', computationId);
      return { outcome: 'WRITTEN', record, replayed: false };
    });
