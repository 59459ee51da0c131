/**
 * The end of a computation: one transaction, *separate* statements. A request that joins while the job finishes holds
 * the computation's row; the first statement waits for it, and the statement that ends the requests must have a
 * snapshot of its own to see it. As one statement it missed such a request.
 */
import { type Database, inTransaction, one, type Transaction } from '../database.ts';
import { type Entry, writeHistory } from '../history/write.ts';
import { notify } from '../notify.ts';
import type { Computations } from '../store.ts';

interface Ended {
  key: string;
  canonical: string;
  engine: string;
}

/** Conditions of this moment, not properties of the question: never kept as its answer. */
const PASSING = new Set(['COMPUTATION_CRASHED', 'COMPUTATION_TIMED_OUT', 'ENGINE_RETIRED', 'INTERNAL']);

async function chipOf(tx: Transaction, id: string): Promise<{ chipId: string; chipRevisionId: string }> {
  const asked = await one<{ chipId: string; chipRevisionId: string }>(
    tx,
    `select chip_id as "chipId", chip_revision_id as "chipRevisionId" from request
     where computation_id = $1 and state in ('QUEUED','RUNNING') limit 1`,
    [id],
  );
  if (!asked) throw new Error(`computation ${id} was live and nobody asks for it`);
  return asked;
}

async function tell(
  tx: Transaction,
  systemId: string,
  id: string,
  entry: Omit<Entry, 'subjectKind'>,
): Promise<void> {
  await writeHistory(tx, { actorId: systemId, tokenId: null }, { ...entry, subjectKind: 'Design' });
  await notify(tx, 'computation', id);
}

export const finishComputation =
  (database: Database, systemId: string): Computations['finishComputation'] =>
  (id, attempt, design, resultHash) =>
    inTransaction<boolean>(database, async (tx, undo) => {
      const ended = await one<Ended>(
        tx,
        `update computation set state = 'DONE', progress = 1, finished_at = now()
         where id = $1 and attempt = $2 and state = 'RUNNING' returning key, canonical, engine`,
        [id, attempt],
      );
      if (!ended) return undo(false);
      const { chipId, chipRevisionId } = await chipOf(tx, id);
      const { compliance, figures } = design;
      await tx.query(
        `insert into design (id, canonical, chip_id, chip_revision_id, engine, family, architecture, filter_order, met,
           worst_margin_db, insertion_loss_db, rejection_db, result, result_hash)
         values ($1, $2, $3, $4, $5, $6, $7, $8, $9, $10, $11, $12, $13, $14) on conflict do nothing`,
        [
          ended.key,
          ended.canonical,
          chipId,
          chipRevisionId,
          ended.engine,
          design.family,
          design.architecture,
          design.order,
          compliance.met,
          compliance.worstMarginDb,
          figures.insertionLossDb,
          figures.rejectionDb,
          JSON.stringify(design),
          resultHash,
        ],
      );
      await tx.query(
        `update request set state = 'DONE', design_id = $2, finished_at = now()
         where computation_id = $1 and state in ('QUEUED','RUNNING')`,
        [id, ended.key],
      );
      await tell(tx, systemId, id, { action: 'design.computed', subjectId: ended.key, chipId });
      return true;
    });

export const refuseComputation =
  (database: Database, systemId: string): Computations['refuseComputation'] =>
  (id, attempt, problem) =>
    inTransaction<boolean>(database, async (tx, undo) => {
      const text = JSON.stringify(problem);
      const ended = await one<Ended>(
        tx,
        `update computation set state = 'FAILED', problem = $3, finished_at = now()
         where id = $1 and attempt = $2 and state = 'RUNNING' returning key, canonical, engine`,
        [id, attempt, text],
      );
      if (!ended) return undo(false);
      const { chipId } = await chipOf(tx, id);
      const lasting = !PASSING.has(problem.code);
      if (lasting) {
        await tx.query(
          'insert into refusal (id, canonical, problem) values ($1, $2, $3) on conflict do nothing',
          [ended.key, ended.canonical, text],
        );
      }
      await tx.query(
        `update request set state = 'FAILED', problem = $2, finished_at = now()
         where computation_id = $1 and state in ('QUEUED','RUNNING')`,
        [id, text],
      );
      await tell(tx, systemId, id, {
        action: lasting ? 'design.refused' : 'design.failed',
        subjectId: ended.key,
        chipId,
        detail: { code: problem.code },
      });
      return true;
    });
