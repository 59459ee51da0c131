import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { problemOf } from '../../../server/problem-error.ts';
import type { StoreEvent } from '../../../server/store/index.ts';
import {
  inventedDesign,
  isBlocked,
  LIMITS,
  type Library,
  makeChip,
  makeDesign,
  makeToken,
  openLibrary,
  questionOf,
  sha256,
  submit,
  type TestChip,
} from '../../support/library.ts';

describe('requests and their shared computation', () => {
  let library: Library;
  let on: TestChip;
  let seed = 0;
  const question = () => questionOf(on, `request-${seed++}`);
  const waiters = async (id: string) =>
    (
      await library.query<{ waiters: number; state: string }>(
        'select waiters, state from computation where id = $1',
        [id],
      )
    )[0];
  const jobs = async (id: string) =>
    (await library.query('select task_identifier, max_attempts from graphile_worker.jobs where key = $1', [
      id,
    ])) as {
      task_identifier: string;
      max_attempts: number;
    }[];

  beforeAll(async () => {
    library = await openLibrary();
    on = await makeChip(library, 'R-1');
  });
  afterAll(() => library.close());

  it('a new question makes one request, one computation and one job of its engine', async () => {
    const request = await submit(library, question());
    expect(request).toMatchObject({
      state: 'QUEUED',
      progress: 0,
      designId: null,
      problem: null,
      asked: { chip: 'R-1' },
    });
    expect(await waiters(request.computationId!)).toEqual({ waiters: 1, state: 'QUEUED' });
    expect(await jobs(request.computationId!)).toEqual([{ task_identifier: 'design/1', max_attempts: 3 }]);
  });

  it('equal questions at once share one computation, whoever comes first', async () => {
    const ask = question();
    const requests = await Promise.all(Array.from({ length: 8 }, () => submit(library, ask)));
    const ids = new Set(requests.map((request) => request.computationId));
    expect(ids.size).toBe(1);
    const [id] = ids;
    expect(await waiters(id!)).toEqual({ waiters: 8, state: 'QUEUED' });
    expect(await jobs(id!)).toHaveLength(1);
  });

  it('a second equal question waits for the first to commit, and makes its own when that one rolls back', async () => {
    const ask = question();
    const first = await library.session();
    await first.query('begin');
    await first.query(
      "insert into computation (id, kind, key, canonical, engine, waiters) values (gen_random_uuid(), 'DESIGN', $1, $2, '1', 1)",
      [ask.key, ask.canonical],
    );
    const second = submit(library, ask);
    expect(await isBlocked(second)).toBe(true);
    await first.query('rollback');
    const request = await second;
    expect(await waiters(request.computationId!)).toEqual({ waiters: 1, state: 'QUEUED' });
    expect(await jobs(request.computationId!)).toHaveLength(1);
  });

  it('a request that joins a running computation is running', async () => {
    const ask = question();
    const first = await submit(library, ask);
    await library.store.startComputation(first.computationId!);
    expect((await library.store.findRequest(first.id))?.state).toBe('RUNNING');
    expect((await submit(library, ask)).state).toBe('RUNNING');
  });

  it('start hands out the text, the engine and the model of the revision asked for', async () => {
    const ask = question();
    const request = await submit(library, ask);
    const started = await library.store.startComputation(request.computationId!);
    expect(started).toMatchObject({ key: ask.key, canonical: ask.canonical, engine: '1', attempt: 1 });
    expect(started?.model).toEqual(on.revision.model);
  });

  it('when the computation finishes, every asker is done, and the same question is answered without a write', async () => {
    const ask = question();
    const [one, two] = [await submit(library, ask), await submit(library, ask)];
    const started = await library.store.startComputation(one.computationId!);
    const design = inventedDesign();
    expect(await library.store.finishComputation(started!.id, 1, design, sha256('result'))).toBe(true);
    for (const { id } of [one, two]) {
      expect(await library.store.findRequest(id)).toMatchObject({
        state: 'DONE',
        progress: 1,
        designId: ask.key,
      });
    }
    const before = await library.query('select count(*)::int as n from request');
    const again = await library.store.submitRequest(library.by, ask, LIMITS);
    expect(again).toMatchObject({
      outcome: 'DESIGN',
      design: { id: ask.key, met: true, rejectionDb: 40, result: design },
    });
    expect(await library.query('select count(*)::int as n from request')).toEqual(before);
  });

  it('finish waits for a request that is joining, and reaches it', async () => {
    const ask = question();
    const first = await submit(library, ask);
    const started = await library.store.startComputation(first.computationId!);
    const joining = await library.session();
    await joining.query('begin');
    await joining.query('update computation set waiters = waiters + 1 where id = $1', [started!.id]);
    const late = '01890000-0000-7000-8000-00000000000a';
    await joining.query(
      `insert into request (id, chip_id, chip_revision_id, asked, key, computation_id, state, created_by)
       values ($1, $2, $3, '{}', $4, $5, 'RUNNING', $6)`,
      [late, on.chip.id, on.revision.id, ask.key, started!.id, library.by.actorId],
    );
    const finishing = library.store.finishComputation(started!.id, 1, inventedDesign(), sha256('r'));
    expect(await isBlocked(finishing)).toBe(true);
    await joining.query('commit');
    expect(await finishing).toBe(true);
    expect((await library.store.findRequest(late))?.state).toBe('DONE');
  });

  it('a question that missed, and whose computation finished before its insert, finds the design at the second look', async () => {
    const ask = question();
    const first = await submit(library, ask);
    const started = await library.store.startComputation(first.computationId!);
    // Holds the finish back after its design is written: the second request misses, then waits at the insert.
    const finishing = await library.session();
    await finishing.query('begin');
    await finishing.query(
      "update computation set state = 'DONE', progress = 1, finished_at = now() where id = $1",
      [started!.id],
    );
    await finishing.query(
      `insert into design (id, canonical, chip_id, chip_revision_id, engine, architecture, filter_order, met, result, result_hash)
       values ($1, $2, $3, $4, '1', 'ALL_PASS_PAIR', 1, true, '{}', $5)`,
      [ask.key, ask.canonical, on.chip.id, on.revision.id, sha256('r')],
    );
    await finishing.query(
      "update request set state = 'DONE', design_id = $2, finished_at = now() where computation_id = $1",
      [started!.id, ask.key],
    );
    const plain = library.store.submitRequest(library.by, ask, LIMITS);
    const keyed = library.store.submitRequest(library.by, ask, LIMITS, {
      key: 'second-look',
      operation: 'requestDesign',
      fingerprint: 'f',
    });
    expect(await isBlocked(Promise.race([plain, keyed]))).toBe(true);
    await finishing.query('commit');
    expect((await plain).outcome).toBe('DESIGN');
    const written = await keyed;
    expect(written).toMatchObject({
      outcome: 'WRITTEN',
      record: { state: 'DONE', computationId: null, designId: ask.key },
    });
    expect(
      await library.query('select count(*)::int as n from computation where key = $1', [ask.key]),
    ).toEqual([{ n: 1 }]);
  });

  describe('cancel', () => {
    it('ends the ask but not the computation while others wait for it', async () => {
      const ask = question();
      const [one, two] = [await submit(library, ask), await submit(library, ask)];
      const cancelled = await library.store.cancelRequest(library.by, one.id);
      expect(cancelled).toMatchObject({
        outcome: 'WRITTEN',
        record: { state: 'CANCELLED' },
        replayed: false,
      });
      expect(await waiters(one.computationId!)).toEqual({ waiters: 1, state: 'QUEUED' });
      expect((await library.store.findRequest(two.id))?.state).toBe('QUEUED');
      expect(await jobs(one.computationId!)).toHaveLength(1);
    });

    it('of the last asker ends the computation, removes its job and tells the workers', async () => {
      const events: StoreEvent[] = [];
      const stop = library.store.notifications.subscribe((event) => events.push(event));
      const request = await submit(library, question());
      await library.store.cancelRequest(library.by, request.id);
      expect(await waiters(request.computationId!)).toEqual({ waiters: 0, state: 'CANCELLED' });
      expect(await jobs(request.computationId!)).toEqual([]);
      await expect.poll(() => events).toContainEqual({ kind: 'CANCEL', id: request.computationId });
      stop();
      expect(await library.store.startComputation(request.computationId!)).toBeNull();
    });

    it('repeated answers the same; of a finished request says so; of an unknown one too', async () => {
      const request = await submit(library, question());
      await library.store.cancelRequest(library.by, request.id);
      expect(await library.store.cancelRequest(library.by, request.id)).toMatchObject({
        outcome: 'WRITTEN',
        replayed: true,
        record: { state: 'CANCELLED' },
      });
      const ask = question();
      const done = await submit(library, ask);
      const started = await library.store.startComputation(done.computationId!);
      await library.store.finishComputation(started!.id, 1, inventedDesign(), sha256('r'));
      expect(await library.store.cancelRequest(library.by, done.id)).toMatchObject({
        outcome: 'FINISHED',
        record: { state: 'DONE' },
      });
      expect(await library.store.cancelRequest(library.by, on.chip.id)).toEqual({ outcome: 'NOT_FOUND' });
      expect(await library.store.cancelRequest(library.by, 'no uuid')).toEqual({ outcome: 'NOT_FOUND' });
    });

    it('while another joins: the cancel waits, and the computation stays for the other', async () => {
      const ask = question();
      const first = await submit(library, ask);
      const joining = await library.session();
      await joining.query('begin');
      await joining.query('update computation set waiters = waiters + 1 where id = $1', [
        first.computationId,
      ]);
      const cancelling = library.store.cancelRequest(library.by, first.id);
      expect(await isBlocked(cancelling)).toBe(true);
      await joining.query('commit');
      expect(await cancelling).toMatchObject({ outcome: 'WRITTEN' });
      expect(await waiters(first.computationId!)).toEqual({ waiters: 1, state: 'QUEUED' });
    });

    it('of the last asker while another joins: the other waits and gets a computation of its own', async () => {
      const ask = question();
      const first = await submit(library, ask);
      const cancelling = await library.session();
      await cancelling.query('begin');
      await cancelling.query('select 1 from computation where id = $1 for update', [first.computationId]);
      await cancelling.query(
        "update request set state = 'CANCELLED', cancelled_by = $2, finished_at = now() where id = $1",
        [first.id, library.by.actorId],
      );
      await cancelling.query(
        "update computation set waiters = 0, state = 'CANCELLED', finished_at = now() where id = $1",
        [first.computationId],
      );
      const joining = submit(library, ask);
      expect(await isBlocked(joining)).toBe(true);
      await cancelling.query('commit');
      const second = await joining;
      expect(second.computationId).not.toBe(first.computationId);
      expect(await waiters(second.computationId!)).toEqual({ waiters: 1, state: 'QUEUED' });
      expect(await jobs(second.computationId!)).toHaveLength(1);
    });
  });

  describe('the fence', () => {
    it('a worker thought dead that comes back changes nothing', async () => {
      const ask = question();
      const request = await submit(library, ask);
      await library.store.startComputation(request.computationId!);
      expect((await library.store.startComputation(request.computationId!))?.attempt).toBe(2);
      const id = request.computationId!;
      const problem = problemOf('SPECIFICATION_UNREACHABLE', 'invented');
      expect(await library.store.reportProgress(id, 1, 0.9)).toBe(false);
      expect(await library.store.finishComputation(id, 1, inventedDesign(), sha256('old'))).toBe(false);
      expect(await library.store.refuseComputation(id, 1, problem)).toBe(false);
      expect(await library.store.findDesign(ask.key)).toBeNull();
      expect(await library.store.findRefusal(ask.key)).toBeNull();
      expect(await library.store.finishComputation(id, 2, inventedDesign(), sha256('new'))).toBe(true);
      expect((await library.store.findDesign(ask.key))?.resultHash).toBe(sha256('new'));
    });

    it('progress rises only, and a report that is overtaken is still accepted', async () => {
      const request = await submit(library, question());
      const { id, attempt } = (await library.store.startComputation(request.computationId!))!;
      expect(await library.store.reportProgress(id, attempt, 0.4)).toBe(true);
      expect(await library.store.reportProgress(id, attempt, 0.2)).toBe(true);
      expect((await library.store.findRequest(request.id))?.progress).toBe(0.4);
    });
  });

  describe('a refusal', () => {
    it('is kept by address and answers the next equal question without a job', async () => {
      const ask = question();
      const request = await submit(library, ask);
      const { id, attempt } = (await library.store.startComputation(request.computationId!))!;
      const problem = problemOf('SPECIFICATION_UNREACHABLE', 'Six rings are needed; the chip has four.', {
        limit: 'RINGS',
      });
      expect(await library.store.refuseComputation(id, attempt, problem)).toBe(true);
      expect(await library.store.findRequest(request.id)).toMatchObject({ state: 'FAILED', problem });
      expect(await library.store.findRefusal(ask.key)).toEqual(problem);
      expect(await library.store.submitRequest(library.by, ask, LIMITS)).toEqual({
        outcome: 'REFUSAL',
        problem,
      });
    });

    it('by the clock is not kept: the next equal question is computed', async () => {
      const ask = question();
      const request = await submit(library, ask);
      const { id, attempt } = (await library.store.startComputation(request.computationId!))!;
      await library.store.refuseComputation(id, attempt, problemOf('COMPUTATION_TIMED_OUT', 'invented'));
      expect((await library.store.findRequest(request.id))?.state).toBe('FAILED');
      expect(await library.store.findRefusal(ask.key)).toBeNull();
      expect((await submit(library, ask)).state).toBe('QUEUED');
    });
  });

  describe('idempotency keys', () => {
    const keyed = (key: string, fingerprint: string) => ({ key, operation: 'requestDesign', fingerprint });

    it('the same again answers the same request in its present state; another body is refused', async () => {
      const ask = question();
      const first = await library.store.submitRequest(library.by, ask, LIMITS, keyed('k-1', 'a'));
      if (first.outcome !== 'WRITTEN') throw new Error(first.outcome);
      await library.store.cancelRequest(library.by, first.record.id);
      const again = await library.store.submitRequest(library.by, ask, LIMITS, keyed('k-1', 'a'));
      expect(again).toMatchObject({
        outcome: 'WRITTEN',
        replayed: true,
        record: { id: first.record.id, state: 'CANCELLED' },
      });
      const other = await library.store.submitRequest(library.by, question(), LIMITS, keyed('k-1', 'b'));
      expect(other).toEqual({ outcome: 'KEY_REUSED' });
    });

    it('sent many times at once writes once', async () => {
      const ask = question();
      const all = await Promise.all(
        Array.from({ length: 8 }, () =>
          library.store.submitRequest(library.by, ask, LIMITS, keyed('k-2', 'a')),
        ),
      );
      const ids = all.map((one) => (one.outcome === 'WRITTEN' ? one.record.id : one.outcome));
      expect(new Set(ids).size).toBe(1);
      expect(all.filter((one) => one.outcome === 'WRITTEN' && !one.replayed)).toHaveLength(1);
    });

    it('belong to their actor', async () => {
      const other = await makeToken(library.store, library.by, 'invented-second', 'DESIGNER');
      const by = { actorId: other.actor.id, tokenId: other.id };
      const mine = await library.store.submitRequest(library.by, question(), LIMITS, keyed('k-3', 'a'));
      const theirs = await library.store.submitRequest(by, question(), LIMITS, keyed('k-3', 'b'));
      expect([mine.outcome, theirs.outcome]).toEqual(['WRITTEN', 'WRITTEN']);
    });

    it('with one, an answer from the store is written as a request that is done', async () => {
      const ask = question();
      await makeDesign(library, ask);
      const hit = await library.store.submitRequest(library.by, ask, LIMITS, keyed('k-4', 'a'));
      expect(hit).toMatchObject({
        outcome: 'WRITTEN',
        record: { state: 'DONE', designId: ask.key, computationId: null },
      });
    });

    it('a refused write does not use up its key', async () => {
      const tight = { ...LIMITS, openPerToken: 0 };
      const ask = question();
      expect(await library.store.submitRequest(library.by, ask, tight, keyed('k-5', 'a'))).toEqual({
        outcome: 'TOO_MANY_OPEN',
      });
      const now = await library.store.submitRequest(library.by, ask, LIMITS, keyed('k-5', 'a'));
      expect(now).toMatchObject({ outcome: 'WRITTEN', replayed: false });
    });
  });

  describe('limits', () => {
    it('a token may have so many open and no more; what finished does not count', async () => {
      const token = await makeToken(library.store, library.by, 'invented-busy', 'DESIGNER');
      const by = { actorId: token.actor.id, tokenId: token.id };
      const limits = { ...LIMITS, openPerToken: 2 };
      const first = await library.store.submitRequest(by, question(), limits);
      await library.store.submitRequest(by, question(), limits);
      expect(await library.store.submitRequest(by, question(), limits)).toEqual({ outcome: 'TOO_MANY_OPEN' });
      if (first.outcome === 'WRITTEN') await library.store.cancelRequest(by, first.record.id);
      expect((await library.store.submitRequest(by, question(), limits)).outcome).toBe('WRITTEN');
    });

    it('a full queue takes no new computation, but lets askers join one', async () => {
      const ask = question();
      await submit(library, ask);
      const full = { ...LIMITS, queue: 1 };
      const refused = question();
      expect(await library.store.submitRequest(library.by, refused, full)).toEqual({ outcome: 'QUEUE_FULL' });
      expect(await library.query('select 1 from computation where key = $1', [refused.key])).toEqual([]);
      expect((await library.store.submitRequest(library.by, ask, full)).outcome).toBe('WRITTEN');
    });
  });

  it('every step leaves its row in the history, in the same transaction', async () => {
    const ask = question();
    const request = await submit(library, ask);
    const started = await library.store.startComputation(request.computationId!);
    await library.store.finishComputation(started!.id, 1, inventedDesign(), sha256('r'));
    const { rows } = await library.store.listHistory({ chipId: on.chip.id }, { first: 2 });
    expect(rows.map(({ row }) => [row.action, row.subjectKind, row.subjectId, row.actor.name])).toEqual([
      ['design.computed', 'Design', ask.key, 'ringbinder'],
      ['design.requested', 'DesignRequest', request.id, 'invented-designer'],
    ]);
    expect(await library.store.findHistoryEntry(rows[0]!.row.id)).toEqual(rows[0]!.row);
  });
});
