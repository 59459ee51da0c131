import { chmod, mkdtemp, rm } from 'node:fs/promises';
import { createServer } from 'node:net';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { type Embedded, startEmbedded } from '../../../server/embedded/index.ts';
import { createStore, type Store, type StoreEvent, StoreUnavailable } from '../../../server/store/index.ts';
import { LIMITS, makeChip, makeToken, questionOf, type TestChip } from '../../support/library.ts';

const logger = { info: () => {}, warn: () => {} };
/** The store waits 2 s for a connection; the rest is for a busy machine. */
const FAST_MS = 4000;

describe('the database goes away', () => {
  let folder: string;
  let server: Embedded;
  let store: Store;
  let on: TestChip;
  let by: { actorId: string; tokenId: string };
  const start = (port?: number) =>
    startEmbedded({
      folder: join(folder, 'data'),
      logger,
      durable: false,
      ...(port === undefined ? {} : { port }),
    });

  beforeAll(async () => {
    folder = await mkdtemp(join(tmpdir(), 'ringbinder-outage-'));
    await chmod(folder, 0o755);
    server = await start();
    store = await createStore({ databaseUrl: server.url });
    await store.bootstrapAdmin({ lookup: 'abcdefghijkl', secretHash: Buffer.alloc(32) });
    const admin = await store.findToken('abcdefghijkl');
    const token = await makeToken(store, { actorId: admin!.actor.id, tokenId: null }, 'invented', 'DESIGNER');
    by = { actorId: token.actor.id, tokenId: token.id };
    on = await makeChip({ store, by }, 'O-1');
  });
  afterAll(async () => {
    await store.close();
    await server.stop();
    await rm(folder, { recursive: true, force: true });
  });

  it('operations fail fast and by name, and the store recovers by itself with nothing lost', async () => {
    const events: StoreEvent['kind'][] = [];
    store.notifications.subscribe((event) => events.push(event.kind));
    const worker = await store.registerWorker(['w-1'], '1');
    const request = await store.submitRequest(by, questionOf(on, 'before'), LIMITS);
    if (request.outcome !== 'WRITTEN') throw new Error(request.outcome);
    const running = store.pool.query('select pg_sleep(30)').catch((error: unknown) => error);
    await server.stop();
    expect(await running).toBeInstanceOf(Error);
    await expect.poll(() => events).toContain('LOST');
    expect(store.notifications.connected).toBe(false);
    const began = Date.now();
    const attempts = [
      store.findChip('O-1'),
      store.listChips({ first: 1 }),
      store.findToken('abcdefghijkl'),
      store.findDesign('0'.repeat(64)),
      store.submitRequest(by, questionOf(on, 'during'), LIMITS),
      store.cancelRequest(by, request.record.id),
      store.sweep(),
      store.registerWorker(['w-2'], '1'),
    ];
    for (const attempt of await Promise.allSettled(attempts)) {
      expect(attempt).toMatchObject({ status: 'rejected', reason: expect.any(StoreUnavailable) });
    }
    expect(await store.ping()).toBe(false);
    expect(Date.now() - began).toBeLessThan(FAST_MS);

    server = await start(server.port);
    await expect.poll(() => store.ping(), { timeout: 5000 }).toBe(true);
    await expect.poll(() => events, { timeout: 8000 }).toContain('RECONNECTED');
    expect(store.notifications.connected).toBe(true);
    expect(await store.findChip('O-1')).toMatchObject({ serial: 'O-1' });
    expect((await store.findRequest(request.record.id))?.state).toBe('QUEUED');
    // Heard on the new connection.
    await store.cancelRequest(by, request.record.id);
    await expect.poll(() => events).toContain('CANCEL');
    // The worker's session came back too, so it is not taken for dead.
    const alive = async () =>
      (
        await store.pool.query(
          "select 1 from worker_process where pool_ids = '{w-1}' and not pg_try_advisory_lock(key)",
        )
      ).rowCount;
    await expect.poll(alive, { timeout: 8000 }).toBe(1);
    await worker.release();
  });

  it('a store cannot be opened without it, and says so by name', async () => {
    await expect(
      createStore({ databaseUrl: 'postgresql://postgres@127.0.0.1:1/none' }),
    ).rejects.toBeInstanceOf(StoreUnavailable);
  });

  it('a server that accepts and never answers is given up after seconds', async () => {
    const silent = createServer(() => {});
    await new Promise<void>((done) => silent.listen(0, '127.0.0.1', done));
    const address = silent.address();
    const port = address !== null && typeof address === 'object' ? address.port : 0;
    const began = Date.now();
    await expect(
      createStore({ databaseUrl: `postgresql://postgres@127.0.0.1:${port}/none` }),
    ).rejects.toBeInstanceOf(StoreUnavailable);
    expect(Date.now() - began).toBeLessThan(FAST_MS);
    silent.close();
  });

  it('an error of our own making is not mistaken for an outage', async () => {
    const wrong = store.saveVersion(by, {
      chipId: '01890000-0000-7000-8000-000000000000',
      configuration: 'c',
      designId: '0'.repeat(64),
      designRevisionId: '01890000-0000-7000-8000-000000000000',
      setting: { channels: [], totalPowerMw: 0, parked: [], cautions: [] },
      contentHash: '',
      note: '',
    });
    await expect(wrong).rejects.toThrow('no chip');
    await expect(wrong).rejects.not.toBeInstanceOf(StoreUnavailable);
  });
});
