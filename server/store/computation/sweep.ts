/**
 * What dead workers leave behind. Every process looks each second; one at a time does the work.
 *
 * 1. A row of `worker_process` whose lock can be taken belongs to a dead process: the row goes, its jobs are unlocked,
 *    and the queue hands them to somebody else. Without this a job stays locked for four hours.
 * 2. A live computation without a job that will run again has used up its attempts: it fails, with its requests, and
 *    the exhausted job goes: the queue would leave it unlocked and unrun for ever.
 * 3. An engine that no live worker has served for ten minutes, while workers of another engine are there, was replaced:
 *    its queued computations fail with ENGINE_RETIRED, and can be asked for again. With no worker at all they wait.
 */
import { problemOf } from '../../problem-error.ts';
import { type Database, inTransaction, type Transaction } from '../database.ts';
import { writeHistory } from '../history/write.ts';
import { notify } from '../notify.ts';
import type { Computations } from '../store.ts';

const SWEEP_LOCK = 4_242_000;

/** Jobs of pools that never registered: killed in the second between the start of a pool and its row. */
const UNKNOWN_POOL_GRACE = '60 seconds';
const RETIREMENT = '10 minutes';
/** Idempotency keys are promised for 24 hours. */
const KEY_AGE = '48 hours';

const CRASHED = problemOf(
  'COMPUTATION_CRASHED',
  'The computation ended abnormally three times. It was not the specification that was refused; ask again, and tell the operator if it repeats.',
);
const RETIRED = problemOf(
  'ENGINE_RETIRED',
  'The service was updated and no process computes with the version this was asked for any more. Ask again.',
);

async function unlockDead(tx: Transaction): Promise<number> {
  const { rows } = await tx.query<{ freed: number }>(
    `with dead as (
       delete from worker_process
       where key in (select key from worker_process where pg_try_advisory_xact_lock(key)) returning pool_ids
     ), names as (
       select unnest(pool_ids) as name from dead
       union
       select locked_by from graphile_worker.jobs j
       where locked_by is not null and locked_at < now() - $1::interval
         and not exists (select 1 from worker_process w where j.locked_by = any(w.pool_ids))
     ), counted as (
       select count(*)::int as freed from graphile_worker.jobs where locked_by in (select name from names)
     )
     select freed, graphile_worker.force_unlock_workers(array(select name from names)) from counted`,
    [UNKNOWN_POOL_GRACE],
  );
  return rows[0]?.freed ?? 0;
}

async function failRequests(
  tx: Transaction,
  systemId: string,
  computations: readonly { id: string; key: string }[],
  problem: typeof CRASHED,
): Promise<void> {
  for (const { id, key } of computations) {
    const { rows } = await tx.query<{ chipId: string }>(
      `update request set state = 'FAILED', problem = $2, finished_at = now()
       where computation_id = $1 and state in ('QUEUED','RUNNING') returning chip_id as "chipId"`,
      [id, problem],
    );
    const chipId = rows[0]?.chipId ?? null;
    await writeHistory(
      tx,
      { actorId: systemId, tokenId: null },
      {
        action: 'design.failed',
        subjectKind: 'Design',
        subjectId: key,
        chipId,
        detail: { code: problem.code },
      },
    );
    await notify(tx, 'computation', id);
  }
}

async function failExhausted(tx: Transaction, systemId: string): Promise<number> {
  const { rows } = await tx.query<{ id: string; key: string }>(
    `update computation c set state = 'FAILED', problem = $1, finished_at = now()
     where state in ('QUEUED','RUNNING') and not exists (
       select 1 from graphile_worker.jobs j
       where j.key = c.id::text and (j.locked_at is not null or j.attempts < j.max_attempts))
     returning id, key, graphile_worker.remove_job(id::text)`,
    [CRASHED],
  );
  await failRequests(tx, systemId, rows, CRASHED);
  return rows.length;
}

async function retireEngines(tx: Transaction, systemId: string): Promise<number> {
  await tx.query(
    `insert into engine_service as s (engine, last_served_at) select distinct engine, now() from worker_process
     on conflict (engine) do update set last_served_at = excluded.last_served_at
     where s.last_served_at < now() - interval '10 seconds'`,
  );
  const { rows } = await tx.query<{ id: string; key: string }>(
    `update computation c set state = 'FAILED', problem = $1, finished_at = now()
     where state = 'QUEUED' and queued_at < now() - $2::interval
       and exists (select 1 from worker_process)
       and not exists (select 1 from worker_process w where w.engine = c.engine)
       and not exists (select 1 from engine_service s
                       where s.engine = c.engine and s.last_served_at >= now() - $2::interval)
     returning id, key, graphile_worker.remove_job(id::text)`,
    [RETIRED, RETIREMENT],
  );
  await failRequests(tx, systemId, rows, RETIRED);
  return rows.length;
}

export const sweep =
  (database: Database, systemId: string): Computations['sweep'] =>
  () =>
    inTransaction(database, async (tx, undo) => {
      const turn = await tx.query<{ mine: boolean }>('select pg_try_advisory_xact_lock($1) as mine', [
        SWEEP_LOCK,
      ]);
      if (turn.rows[0]?.mine !== true) return undo({ freed: 0, failed: 0 });
      const freed = await unlockDead(tx);
      const exhausted = await failExhausted(tx, systemId);
      const retired = await retireEngines(tx, systemId);
      await tx.query('delete from idempotency where created_at < now() - $1::interval', [KEY_AGE]);
      return { freed, failed: exhausted + retired };
    });
