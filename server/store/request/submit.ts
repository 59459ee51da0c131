/**
 * A person's ask meets the shared computation.
 *
 * Single flight is a partial unique index on live computations. Two equal requests at once: the second waits on the
 * first's row, then joins it, or makes its own if the first rolled back. A request that joins while the last asker
 * cancels finds the row out of the index and makes a new one. And between a look-up that missed and the insert a
 * computation may have ended: whoever *creates* one looks for the answer again, and takes the computation back.
 */
import { v7 as newId } from 'uuid';
import { type Database, inTransaction, one, type Transaction } from '../database.ts';
import { readDesign, readRefusal } from '../design/find.ts';
import { writeHistory } from '../history/write.ts';
import { claimKey, settleKey } from '../idempotency.ts';
import { notify } from '../notify.ts';
import type { Acting, Idempotency, RequestState } from '../records.ts';
import type { Designs, SubmitAsk, Submitted } from '../store.ts';
import { readRequest } from './find.ts';

interface Known {
  readonly answer: Extract<Submitted, { outcome: 'DESIGN' | 'REFUSAL' }>;
  readonly row: RequestValues;
}

interface RequestValues {
  readonly state: RequestState;
  readonly computationId?: string;
  readonly designId?: string;
  readonly problem?: unknown;
}

interface Attached {
  id: string;
  state: RequestState;
  created: boolean;
}

async function lookUp(on: Transaction, key: string): Promise<Known | null> {
  // Nearly always there is nothing: one question for both.
  const any = await one<{ known: boolean }>(
    on,
    `select exists (select 1 from design where id = $1) or exists (select 1 from refusal where id = $1) as known`,
    [key],
  );
  if (any?.known !== true) return null;
  const design = await readDesign(on, key);
  if (design) return { answer: { outcome: 'DESIGN', design }, row: { state: 'DONE', designId: key } };
  const problem = await readRefusal(on, key);
  return problem && { answer: { outcome: 'REFUSAL', problem }, row: { state: 'FAILED', problem } };
}

async function attach(tx: Transaction, ask: SubmitAsk): Promise<Attached> {
  const { rows } = await tx.query<Attached>({
    name: 'attach-computation',
    text: `insert into computation (id, kind, key, canonical, engine, waiters) values ($1, 'DESIGN', $2, $3, $4, 1)
           on conflict (kind, key) where state in ('QUEUED','RUNNING')
             do update set waiters = computation.waiters + 1
           returning id, state, (xmax = 0) as created`,
    values: [newId(), ask.key, ask.canonical, ask.engine],
  });
  if (!rows[0]) throw new Error('neither created nor joined a computation');
  return rows[0];
}

/** Its key is the computation's id, so that a cancel finds it; the task's name carries the engine, so that other engines leave it. */
async function enqueue(tx: Transaction, computationId: string, engine: string): Promise<void> {
  await tx.query({
    name: 'enqueue-computation',
    text: `select graphile_worker.add_job('design/' || $2::text, json_build_object('id', $1::text), job_key := $1::text,
             max_attempts := 3)`,
    values: [computationId, engine],
  });
}

interface Load {
  open: number;
  queued: number;
}

/**
 * Live requests of the token and computations that wait, each counted only as far as its limit. Without a lock: requests
 * sent at the same instant may pass together, by as many as there are at once.
 */
async function loadOf(
  tx: Transaction,
  by: Acting,
  limits: { openPerToken: number; queue: number },
): Promise<Load> {
  const mine = by.tokenId === null ? 'token_id is null and created_by = $1' : 'token_id = $1';
  const load = await one<Load>(
    tx,
    `select
       (select count(*)::int from (select 1 from request where state in ('QUEUED','RUNNING') and ${mine} limit $2) live) as open,
       (select count(*)::int from (select 1 from computation where state = 'QUEUED' limit $3) waiting) as queued`,
    [by.tokenId ?? by.actorId, limits.openPerToken, limits.queue],
  );
  return load ?? { open: 0, queued: 0 };
}

async function write(
  tx: Transaction,
  by: Acting,
  ask: SubmitAsk,
  values: RequestValues,
  idempotency: Idempotency | undefined,
): Promise<Submitted> {
  const id = newId();
  await tx.query({
    name: 'write-request',
    text: `insert into request (id, chip_id, chip_revision_id, asked, key, computation_id, design_id, state, problem,
             created_by, token_id, finished_at)
           values ($1, $2, $3, $4, $5, $6, $7, $8, $9, $10, $11,
             case when $8 in ('DONE','FAILED') then now() end)`,
    values: [
      id,
      ask.chipId,
      ask.chipRevisionId,
      JSON.stringify(ask.asked),
      ask.key,
      values.computationId ?? null,
      values.designId ?? null,
      values.state,
      values.problem ?? null,
      by.actorId,
      by.tokenId,
    ],
  });
  await writeHistory(tx, by, {
    action: 'design.requested',
    subjectKind: 'DesignRequest',
    subjectId: id,
    chipId: ask.chipId,
    detail: { key: ask.key, cached: values.computationId === undefined },
  });
  if (values.computationId !== undefined) await notify(tx, 'computation', values.computationId);
  await settleKey(tx, by, idempotency, id);
  const record = await readRequest(tx, id);
  if (!record) throw new Error('a request just written is not there');
  return { outcome: 'WRITTEN', record, replayed: false };
}

export const submitRequest =
  (database: Database): Designs['submitRequest'] =>
  (by, ask, limits, idempotency) =>
    // Whoever calls has looked for the answer already; it is looked for again where that counts.
    inTransaction<Submitted>(database, async (tx, undo) => {
      const claim = await claimKey(tx, by, idempotency);
      if (claim.kind === 'REUSED') return undo({ outcome: 'KEY_REUSED' });
      if (claim.kind === 'REPLAY') {
        const record = await readRequest(tx, claim.subjectId);
        if (!record) throw new Error('the request that a key names is not there');
        return { outcome: 'WRITTEN', record, replayed: true };
      }
      const before = idempotency ? await lookUp(tx, ask.key) : null;
      if (before) return write(tx, by, ask, before.row, idempotency);
      const load = await loadOf(tx, by, limits);
      if (load.open >= limits.openPerToken) return undo({ outcome: 'TOO_MANY_OPEN' });
      if (idempotency) await tx.query('savepoint s');
      const computation = await attach(tx, ask);
      if (computation.created) {
        const known = await lookUp(tx, ask.key);
        if (known && !idempotency) return undo(known.answer);
        if (known) {
          await tx.query('rollback to s');
          return write(tx, by, ask, known.row, idempotency);
        }
        if (load.queued >= limits.queue) return undo({ outcome: 'QUEUE_FULL' });
        await enqueue(tx, computation.id, ask.engine);
      }
      return write(tx, by, ask, { state: computation.state, computationId: computation.id }, idempotency);
    });
