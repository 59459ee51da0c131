import { fork } from 'node:child_process';
import { once } from 'node:events';
import { fileURLToPath } from 'node:url';
import { afterAll, beforeAll, beforeEach, describe, expect, it } from 'vitest';
import {
  type Library,
  makeChip,
  openLibrary,
  questionOf,
  submit,
  type TestChip,
} from '../../support/library.ts';

describe('what dead workers leave behind', () => {
  let library: Library;
  let on: TestChip;
  let seed = 0;

  beforeAll(async () => {
    library = await openLibrary();
    on = await makeChip(library, 'S-1');
  });
  afterAll(() => library.close());
  beforeEach(async () => {
    await library.query('delete from worker_process');
    await library.query('delete from engine_service');
  });

  /** A computation as it is while some pool holds its job. */
  async function held(pool: string | null, attempts: number, engine = '1') {
    const request = await submit(library, questionOf(on, `sweep-${seed++}`, engine));
    const id = request.computationId!;
    if (pool !== null) await library.store.startComputation(id);
    await library.query(
      `update graphile_worker._private_jobs set attempts = $2, locked_by = $3,
         locked_at = case when $3::text is null then null else now() end where key = $1`,
      [id, attempts, pool],
    );
    return { request: request.id, computation: id };
  }
  const stateOf = async (request: string) => (await library.store.findRequest(request))?.state;
  const lockOf = async (computation: string) =>
    (
      await library.query<{ locked_by: string | null }>(
        'select locked_by from graphile_worker.jobs where key = $1',
        [computation],
      )
    )[0]?.locked_by;

  it('frees the jobs of a dead process, leaves those of a live one, and fails what has no attempt left', async () => {
    const alive = await library.store.registerWorker(['w-alive'], '1');
    await library.query("insert into worker_process (key, pool_ids, engine) values (7, '{w-dead}', '1')");
    const kept = await held('w-alive', 1);
    const lastOfAlive = await held('w-alive', 3);
    const retried = await held('w-dead', 1);
    const lastOfDead = await held('w-dead', 3);
    const waiting = await held(null, 2);
    expect(await library.store.sweep()).toEqual({ freed: 2, failed: 1 });
    expect(await lockOf(kept.computation)).toBe('w-alive');
    expect(await lockOf(retried.computation)).toBeNull();
    expect(await stateOf(kept.request)).toBe('RUNNING');
    expect(await stateOf(lastOfAlive.request)).toBe('RUNNING');
    expect(await stateOf(retried.request)).toBe('RUNNING');
    expect(await stateOf(waiting.request)).toBe('QUEUED');
    expect(await library.store.findRequest(lastOfDead.request)).toMatchObject({
      state: 'FAILED',
      problem: { code: 'COMPUTATION_CRASHED' },
    });
    expect(await library.store.sweep()).toEqual({ freed: 0, failed: 0 });
    await alive.release();
    expect(await library.query('select 1 from worker_process')).toEqual([]);
  });

  it('fails a live computation whose job vanished', async () => {
    const lost = await held(null, 0);
    await library.query('delete from graphile_worker._private_jobs where key = $1', [lost.computation]);
    expect((await library.store.sweep()).failed).toBe(1);
    expect(await stateOf(lost.request)).toBe('FAILED');
  });

  it('frees the jobs of a pool that never registered, after a minute', async () => {
    const job = await held('w-unknown', 1);
    expect(await library.store.sweep()).toEqual({ freed: 0, failed: 0 });
    await library.query(
      "update graphile_worker._private_jobs set locked_at = now() - interval '61 seconds' where key = $1",
      [job.computation],
    );
    expect(await library.store.sweep()).toEqual({ freed: 1, failed: 0 });
  });

  it('a process killed with -9 is noticed by the database, with no clock involved', async () => {
    const child = fork(
      fileURLToPath(new URL('./worker-process.mjs', import.meta.url)),
      [library.database.url],
      {
        stdio: ['ignore', 'ignore', 'inherit', 'ipc'],
      },
    );
    await once(child, 'message');
    const job = await held('w-forked', 1);
    expect(await library.store.sweep()).toEqual({ freed: 0, failed: 0 });
    child.kill('SIGKILL');
    await once(child, 'exit');
    // The server notices the closed socket in its own time.
    await expect.poll(async () => (await library.store.sweep()).freed, { timeout: 5000 }).toBe(1);
    expect(await lockOf(job.computation)).toBeNull();
  });

  it('a worker whose session is cut registers again by itself', async () => {
    const worker = await library.store.registerWorker(['w-cut'], '1');
    const keys = () => library.query<{ key: string }>('select key from worker_process');
    const [before] = await keys();
    await library.query(
      `select pg_terminate_backend(pid) from pg_locks where locktype = 'advisory' and pid <> pg_backend_pid()
         and (classid::bigint << 32) + objid::bigint = $1::bigint`,
      [before!.key],
    );
    await expect
      .poll(async () => {
        await library.store.sweep();
        return (await keys()).map((row) => row.key === before!.key);
      })
      .toEqual([false]);
    await worker.release();
    expect(await keys()).toEqual([]);
  });

  it('retires the queue of an engine that was replaced, not one whose workers merely restart, nor a queue without any worker', async () => {
    const old = await held(null, 0, 'old');
    const age = () =>
      library.query("update computation set queued_at = now() - interval '11 minutes' where id = $1", [
        old.computation,
      ]);
    await age();
    expect((await library.store.sweep()).failed).toBe(0);
    const other = await library.store.registerWorker(['w-new'], 'new');
    const same = await library.store.registerWorker(['w-old'], 'old');
    await library.store.sweep();
    await same.release();
    // Served a moment ago: the row is gone because its worker restarts.
    expect((await library.store.sweep()).failed).toBe(0);
    await library.query(
      "update engine_service set last_served_at = now() - interval '11 minutes' where engine = 'old'",
    );
    expect((await library.store.sweep()).failed).toBe(1);
    expect(await library.store.findRequest(old.request)).toMatchObject({
      state: 'FAILED',
      problem: { code: 'ENGINE_RETIRED' },
    });
    expect(await lockOf(old.computation)).toBeUndefined();
    await other.release();
  });

  it('forgets idempotency keys after two days, not before', async () => {
    const key = (name: string) => ({ key: name, operation: 'requestDesign', fingerprint: 'f' });
    for (const name of ['young', 'old']) {
      await library.store.submitRequest(
        library.by,
        questionOf(on, `keys-${name}`),
        { openPerToken: 200, queue: 100 },
        key(name),
      );
    }
    await library.query(
      "update idempotency set created_at = now() - interval '25 hours' where key = 'young'",
    );
    await library.query("update idempotency set created_at = now() - interval '49 hours' where key = 'old'");
    await library.store.sweep();
    expect(await library.query("select key from idempotency where key in ('young', 'old')")).toEqual([
      { key: 'young' },
    ]);
  });

  it('counts what waits and what runs', async () => {
    const before = await library.store.queueDepth();
    await held(null, 0);
    await held('w-unknown', 1);
    expect(await library.store.queueDepth()).toEqual({
      queued: before.queued + 1,
      running: before.running + 1,
    });
  });
});
