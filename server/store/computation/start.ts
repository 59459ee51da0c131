import type { ChipModelInput } from '../../../schema/chip.ts';
import { type Database, inTransaction, one } from '../database.ts';
import { notify } from '../notify.ts';
import type { ComputationRecord } from '../records.ts';
import type { Computations } from '../store.ts';

type Started = Omit<ComputationRecord, 'attempt'> & { attempt: number };

/** RUNNING may start again: its worker died, the queue gave the job to another, and the raised attempt fences the first off. */
export const startComputation =
  (database: Database): Computations['startComputation'] =>
  (id) =>
    inTransaction(database, async (tx, undo) => {
      const started = await one<Started>(
        tx,
        `update computation set state = 'RUNNING', attempt = attempt + 1, started_at = now()
         where id = $1 and state in ('QUEUED','RUNNING') returning id, key, canonical, engine, attempt`,
        [id],
      );
      if (!started) return undo(null);
      await tx.query(`update request set state = 'RUNNING' where computation_id = $1 and state = 'QUEUED'`, [
        id,
      ]);
      // All its askers named the same revision: its hash is part of the address.
      const revision = await one<{ model: ChipModelInput }>(
        tx,
        `select v.model from request r join chip_revision v on v.id = r.chip_revision_id
         where r.computation_id = $1 and r.state in ('QUEUED','RUNNING') limit 1`,
        [id],
      );
      if (!revision) throw new Error(`computation ${id} is live and nobody asks for it`);
      await notify(tx, 'computation', id);
      return { ...started, model: revision.model };
    });
