/** Worker processes on a real PostgreSQL, killed, stopped and doubled. Only the time a computation takes is arranged. */
import { createHash } from 'node:crypto';
import { setTimeout as sleep } from 'node:timers/promises';
import { afterAll, afterEach, beforeAll, describe, expect, it } from 'vitest';
import { canonicalJson } from '../../../schema/jcs.ts';
import { createTestDatabase, type TestDatabase } from '../../support/postgres.ts';
import { isFinal, type Lab, openLab, type WorkerProcess } from './lab.ts';

/** Long enough to act in the middle of it. */
const HELD = { TEST_HOLD_MS: '4000' };
const isUnderWay = ({ state, progress }: { state: string; progress: number }): boolean =>
  state === 'RUNNING' && progress > 0;

/** Computations that a process says it has ended. */
const endedIn = (worker: { log(): string }): number => worker.log().match(/computation ended/g)?.length ?? 0;

describe('worker processes', () => {
  let database: TestDatabase;
  let lab: Lab;
  const workers: WorkerProcess[] = [];
  const start = async (environment: Record<string, string> = {}): Promise<WorkerProcess> => {
    const worker = await lab.startWorker(environment);
    workers.push(worker);
    return worker;
  };
  const attemptsOf = async (computationId: string | null): Promise<number> => {
    const { rows } = await lab.store.pool.query('select attempt from computation where id = $1', [
      computationId,
    ]);
    return rows[0].attempt;
  };
  const jobsLeft = async (): Promise<number> => {
    const { rows } = await lab.store.pool.query('select count(*)::int as n from graphile_worker.jobs');
    return rows[0].n;
  };

  beforeAll(async () => {
    database = await createTestDatabase();
    lab = await openLab(database.url);
  });
  afterEach(async () => {
    await Promise.all(
      workers.splice(0).map((worker) => (worker.child.signalCode === null ? worker.kill('SIGTERM') : null)),
    );
  });
  afterAll(async () => {
    await lab.close();
    await database.drop();
  });

  it('compute what is asked, tell how far they are, and store a design with the hash of its content', async () => {
    await start({ TEST_HOLD_MS: '1500' });
    const { id } = await lab.askNew();
    const seen: number[] = [];
    const done = await lab.waitFor(id, (request) => {
      if (seen.at(-1) !== request.progress) seen.push(request.progress);
      return isFinal(request);
    });
    expect(done.state).toBe('DONE');
    expect(seen).toEqual([...seen].sort((a, b) => a - b));
    // Two a second for 1.5 s, the first and the last.
    expect(seen.length).toBeGreaterThanOrEqual(4);
    expect(seen.length).toBeLessThanOrEqual(7);
    const design = (await lab.store.findDesign(done.designId!))!;
    expect(design.result.transferFunctions.OUT2.poles.length).toBe(design.filterOrder);
    expect(design.resultHash).toBe(createHash('sha256').update(canonicalJson(design.result)).digest('hex'));
    await expect.poll(jobsLeft).toBe(0);
  });

  it('take over, within seconds, what a killed one was computing, and it is finished exactly once', async () => {
    const first = await start(HELD);
    const request = await lab.askNew();
    await lab.waitFor(request.id, isUnderWay);
    const second = await start();
    await first.kill('SIGKILL');
    const killedAt = Date.now();
    await lab.waitFor(request.id, isFinal);
    // A look a second for dead workers, another for the freed job; the rest is room for a busy machine.
    expect(Date.now() - killedAt).toBeLessThan(8_000);
    expect((await lab.store.findRequest(request.id))!.state).toBe('DONE');
    expect(await attemptsOf(request.computationId)).toBe(2);
    expect(second.log()).toContain('took care of what dead workers left');
    expect(first.log()).not.toContain('computation ended');
    // What a process has written reaches us a moment after what it has stored.
    await expect.poll(() => endedIn(second)).toBe(1);
    const { rows } = await lab.store.pool.query(
      'select count(*)::int as n from history where subject_id = $1 and action = $2',
      [request.key, 'design.computed'],
    );
    expect(rows[0].n).toBe(1);
    await expect.poll(jobsLeft).toBe(0);
  });

  it('give back at once, and without counting an attempt, what they compute when told to stop', async () => {
    const first = await start(HELD);
    const request = await lab.askNew();
    await lab.waitFor(request.id, isUnderWay);
    await first.kill('SIGTERM');
    expect(first.child.exitCode).toBe(0);
    const { rows } = await lab.store.pool.query(
      'select max_attempts - attempts as left, locked_by, run_at <= now() as due from graphile_worker.jobs where key = $1',
      [request.computationId],
    );
    expect(rows).toEqual([{ left: 3, locked_by: null, due: true }]);
    await start();
    expect((await lab.waitFor(request.id, isFinal)).state).toBe('DONE');
  });

  it('let a running computation finish when told to stop, if it does in time', async () => {
    const worker = await start({ TEST_HOLD_MS: '1500', TEST_DRAIN_S: '10' });
    const request = await lab.askNew();
    await lab.waitFor(request.id, isUnderWay);
    await worker.kill('SIGTERM');
    expect((await lab.store.findRequest(request.id))!.state).toBe('DONE');
    expect(await attemptsOf(request.computationId)).toBe(1);
  });

  it('end the thread of a computation whose last asker left, and are free for the next at once', async () => {
    const worker = await start({ TEST_HOLD_MS: '20000' });
    const request = await lab.askNew();
    await lab.waitFor(request.id, isUnderWay);
    const cancelledAt = Date.now();
    await lab.cancel(request);
    while (!worker.log().includes('"outcome":"CANCELLED"')) await sleep(5);
    expect(Date.now() - cancelledAt).toBeLessThan(2_000);
    expect((await lab.store.findRequest(request.id))!.state).toBe('CANCELLED');
    // The only thread is busy for 20 s unless it was ended.
    const next = await lab.askNew();
    await lab.waitFor(next.id, isUnderWay);
    await lab.cancel(next);
    while (worker.log().split('"outcome":"CANCELLED"').length < 3) await sleep(5);
    await expect.poll(jobsLeft).toBe(0);
  });

  it('store a refusal as the answer, once, and do not try again', async () => {
    const worker = await start();
    const specification = {
      family: {
        family: 'BUTTERWORTH',
        shape: 'LOW_PASS',
        order: 12,
        centreGhz: 0,
        band: { lowGhz: -5, highGhz: 5 },
        output: 'OUT2',
      },
    } as const;
    const asked = await lab.ask(specification);
    if (asked.outcome !== 'WRITTEN') throw new Error(asked.outcome);
    const failed = await lab.waitFor(asked.record.id, isFinal);
    expect(failed.state).toBe('FAILED');
    // Order 12 needs twelve rings; the invented chip has four.
    expect(failed.problem).toMatchObject({ code: 'SPECIFICATION_UNREACHABLE', limit: 'RINGS' });
    expect(await attemptsOf(failed.computationId)).toBe(1);
    await expect.poll(jobsLeft).toBe(0);
    expect((await lab.ask(specification)).outcome).toBe('REFUSAL');
    await expect.poll(() => endedIn(worker)).toBe(1);
  });

  it('fail what takes longer than it may, without keeping that as the answer', async () => {
    await start({ TEST_HOLD_MS: '20000', TEST_TIMEOUT_S: '1' });
    const request = await lab.askNew();
    const failed = await lab.waitFor(request.id, isFinal);
    expect(failed.state).toBe('FAILED');
    expect(failed.problem?.code).toBe('COMPUTATION_TIMED_OUT');
    expect(await lab.store.findRefusal(request.key)).toBeNull();
    await expect.poll(jobsLeft).toBe(0);
  });

  it('end at the first attempt what does not converge, say what it was, and do not keep that as the answer', async () => {
    const worker = await start();
    const askedAt = Date.now();
    const request = await lab.askNew('endless');
    const failed = await lab.waitFor(request.id, isFinal);
    // A second attempt would come a second or more after the first: the queue waits exp(attempts) s.
    expect(Date.now() - askedAt).toBeLessThan(2_000);
    expect(failed).toMatchObject({ state: 'FAILED', problem: { code: 'COMPUTATION_CRASHED' } });
    expect(failed.problem?.detail).toMatch(
      /invented iteration did not converge in 40 iterations \(residual 1\.25e-1\)/,
    );
    expect(await attemptsOf(request.computationId)).toBe(1);
    expect(await lab.store.findRefusal(request.key)).toBeNull();
    await expect.poll(jobsLeft).toBe(0);
    await expect.poll(() => endedIn(worker)).toBe(1);
    // Asked again, it is computed again, by the same worker.
    const again = await lab.waitFor((await lab.askNew('endless')).id, isFinal);
    expect(again.state).toBe('FAILED');
    expect(again.computationId).not.toBe(request.computationId);
    expect((await lab.waitFor((await lab.askNew()).id, isFinal)).state).toBe('DONE');
  });

  it('try a computation that brings its thread down three times, survive it, and then say so', async () => {
    const worker = await start();
    const request = await lab.askNew('crash');
    const failed = await lab.waitFor(request.id, isFinal);
    expect(failed.problem?.code).toBe('COMPUTATION_CRASHED');
    expect(await attemptsOf(request.computationId)).toBe(3);
    await expect.poll(jobsLeft).toBe(0);
    expect(worker.child.exitCode).toBeNull();
    const next = await lab.askNew();
    expect((await lab.waitFor(next.id, isFinal)).state).toBe('DONE');
  });

  it('lose every connection to the database in the middle and nothing else: the design is stored, its death noticed', async () => {
    const worker = await start({ TEST_HOLD_MS: '2000' });
    const request = await lab.askNew();
    await lab.waitFor(request.id, isUnderWay);
    const client = await lab.store.pool.connect();
    await client.query(
      `select pg_terminate_backend(pid) from pg_stat_activity
       where datname = current_database() and pid <> pg_backend_pid()`,
    );
    client.release();
    // Ours were cut too, and notice it at their next use.
    await expect.poll(() => lab.store.ping()).toBe(true);
    expect((await lab.waitFor(request.id, isFinal)).state).toBe('DONE');
    // It registered again: when it is killed now, another still learns of it.
    const next = await lab.askNew();
    await lab.waitFor(next.id, isUnderWay);
    await worker.kill('SIGKILL');
    await start();
    expect((await lab.waitFor(next.id, isFinal)).state).toBe('DONE');
  });

  it('share one queue: two workers each do a part, nothing twice', async () => {
    const both = await Promise.all([start({ TEST_HOLD_MS: '200' }), start({ TEST_HOLD_MS: '200' })]);
    const requests = await Promise.all(Array.from({ length: 12 }, () => lab.askNew()));
    for (const { id } of requests) expect((await lab.waitFor(id, isFinal)).state).toBe('DONE');
    await expect.poll(() => endedIn(both[0]!) + endedIn(both[1]!)).toBe(requests.length);
    expect(Math.min(...both.map(endedIn))).toBeGreaterThan(0);
    for (const { computationId } of requests) expect(await attemptsOf(computationId)).toBe(1);
  });
});
