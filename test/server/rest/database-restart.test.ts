/**
 * The database itself is stopped for ten seconds, under a computation that runs and one that waits, while people ask and
 * watch: a PostgreSQL of the test's own, started again on the same folder and port.
 */
import { type ChildProcess, spawn } from 'node:child_process';
import { randomUUID } from 'node:crypto';
import { once } from 'node:events';
import { chmod, mkdtemp, rm } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { setTimeout as sleep } from 'node:timers/promises';
import { fileURLToPath } from 'node:url';
import { afterAll, beforeAll, describe, expect, it, vi } from 'vitest';
import { type Embedded, startEmbedded } from '../../../server/embedded/index.ts';
import { openLine } from '../graphql/ask.ts';
import { type Answer, type Service, startService } from './service.ts';

const AWAY_MS = 10_000;
/** A person waits that long for a "no". */
const REFUSED_WITHIN_MS = 3_000;
/** Each computation lasts that long: the one that runs when the database goes ends while it is away. */
const HOLD_MS = 4_000;
/** Reconnecting takes at most 5 s (the store's longest delay), the queue a second or two more; twice that on a busy machine. */
const RECOVERY_MS = 20_000;

const quiet = { info: () => {}, warn: () => {} };

let folder: string;
let database: Embedded;
let service: Service;
let worker: ChildProcess;
let workerLog = '';

const startDatabase = (port?: number): Promise<Embedded> =>
  startEmbedded({ folder: join(folder, 'postgres'), logger: quiet, ...(port === undefined ? {} : { port }) });

function startWorker(): ChildProcess {
  const file = fileURLToPath(new URL('../jobs/worker-process.ts', import.meta.url));
  const child = spawn(process.execPath, ['--import', 'tsx', file], {
    env: { ...process.env, DATABASE_URL: database.url, TEST_HOLD_MS: String(HOLD_MS) },
    stdio: ['ignore', 'pipe', 'pipe'],
  });
  for (const stream of [child.stdout, child.stderr])
    stream.on('data', (chunk: Buffer) => {
      workerLog += chunk.toString();
    });
  return child;
}

beforeAll(async () => {
  folder = await mkdtemp(join(tmpdir(), 'ringbinder-away-'));
  // As root the database runs as another user, who must be able to pass.
  await chmod(folder, 0o755);
  database = await startDatabase();
  service = await startService({ databaseUrl: async () => database.url });
  expect((await service.registerChip('AWAY-3')).status).toBe(201);
  worker = startWorker();
  await vi.waitFor(() => expect(workerLog).toContain('READY'), { timeout: RECOVERY_MS });
});
afterAll(async () => {
  if (worker?.exitCode === null && worker.signalCode === null) {
    worker.kill('SIGKILL');
    await once(worker, 'exit');
  }
  await service?.stop();
  await database?.stop();
  await rm(folder, { recursive: true, force: true });
});

/** Another question for each width. */
const asking = (widthGhz: number) => ({
  chip: 'AWAY-3',
  specification: {
    family: {
      ...{ family: 'BUTTERWORTH', shape: 'LOW_PASS', order: 3 },
      band: { offsetGhz: { low: -widthGhz, high: widthGhz } },
    },
  },
});

const ask = (widthGhz: number, key: string = randomUUID()): Promise<Answer> =>
  service.call('/v1/design-requests', {
    method: 'POST',
    headers: { 'idempotency-key': key },
    body: asking(widthGhz),
  });

const longPoll = (location: string, etag: string): Promise<Answer> =>
  service.call(location, { headers: { 'if-none-match': etag, prefer: 'wait=30' } });

const stateOf = async (location: string): Promise<string> => (await service.call(location)).json.state;

/** The states a subscription tells, as they come. */
function watchedStates(id: string): { readonly states: string[]; readonly ended: Promise<void> } {
  const line = openLine(service.url, { token: service.tokens.DESIGNER });
  const events = line.follow(
    'subscription ($id: ID!) { designRequestChanged(id: $id) { state problem { code } } }',
    { id },
  );
  const states: string[] = [];
  const follow = async (): Promise<void> => {
    for await (const event of events) states.push(event.data.designRequestChanged.state);
    await line.client.dispose();
  };
  return { states, ended: follow() };
}

async function expectRefused(what: string, answering: Promise<Answer>): Promise<void> {
  const began = performance.now();
  const answer = await answering;
  expect(performance.now() - began, what).toBeLessThan(REFUSED_WITHIN_MS);
  expect([what, answer.status, answer.json?.code]).toEqual([what, 503, 'SERVICE_UNAVAILABLE']);
  expect(answer.headers.get('content-type')).toBe('application/problem+json');
  expect(answer.headers.get('retry-after')).toMatch(/^\d+$/);
  expect(answer.text).not.toMatch(/ECONN|postgres|127\.0\.0\.1/);
}

/** What a lab goes on doing for as long as the database is away. */
async function useMeanwhile(until: number, running: string, key: string): Promise<number> {
  let rounds = 0;
  for (; performance.now() < until; rounds++) {
    await expectRefused('a list', service.call('/v1/chips'));
    await expectRefused('a request', service.call(running));
    await expectRefused('a pull', service.call('/v1/chips/AWAY-3/releases/current.csv'));
    await expectRefused('a long poll', service.call(running, { headers: { prefer: 'wait=30' } }));
    await expectRefused('a question', ask(7, key));
    await expectRefused('readiness', service.call('/readyz', { token: null }));
    expect((await service.call('/healthz', { token: null })).status).toBe(200);
    await sleep(500);
  }
  return rounds;
}

async function count(sql: string): Promise<Record<string, unknown>[]> {
  return (await service.store.pool.query(sql)).rows;
}

describe('a database that is stopped for ten seconds and started again', () => {
  it('loses nothing: a running and a queued computation end once, watchers go on, everybody else gets 503 meanwhile', async () => {
    const first = await ask(5);
    const running = first.headers.get('location')!;
    await expect.poll(() => stateOf(running), { timeout: RECOVERY_MS }).toBe('RUNNING');
    const second = await ask(6);
    const queued = second.headers.get('location')!;
    const subscribed = [watchedStates(first.json.id), watchedStates(second.json.id)];
    await expect.poll(() => subscribed.map(({ states }) => states.at(-1))).toEqual(['RUNNING', 'QUEUED']);
    const poll = longPoll(queued, second.headers.get('etag')!);
    await sleep(200);

    await database.stop();
    const until = performance.now() + AWAY_MS;
    expect((await poll).status).toBe(503);
    const key = randomUUID();
    expect(await useMeanwhile(until, running, key)).toBeGreaterThan(1);
    // The computation ended with nowhere to put its design.
    expect(workerLog).toContain('result not stored yet: the database is away');
    expect(workerLog).not.toContain('computation ended');

    database = await startDatabase(database.port);
    expect(database.adopted).toBe(false);
    const ready = () => service.call('/readyz', { token: null }).then(({ status }) => status);
    await expect.poll(ready, { timeout: RECOVERY_MS }).toBe(200);
    await expect.poll(() => service.store.notifications.connected, { timeout: RECOVERY_MS }).toBe(true);

    // What was refused is taken when it is sent again, and with its key only once.
    const [again, repeated] = [await ask(7, key), await ask(7, key)];
    expect(again.status).toBe(202);
    expect(repeated.json.id).toBe(again.json.id);
    const third = again.headers.get('location')!;
    const changed = await longPoll(third, again.headers.get('etag')!);
    expect([changed.status, changed.json.state]).toEqual([200, 'RUNNING']);
    for (const location of [running, queued, third])
      await expect.poll(() => stateOf(location), { timeout: RECOVERY_MS }).toBe('DONE');
    await Promise.all(subscribed.map(({ ended }) => ended));
    for (const { states } of subscribed) expect(states.at(-1)).toBe('DONE');

    // Exactly once, in the library and in the history of it.
    expect(await count('select state, count(*)::int as n from request group by state')).toEqual([
      { state: 'DONE', n: 3 },
    ]);
    expect(await count('select state, attempt from computation')).toEqual(
      Array.from({ length: 3 }, () => ({ state: 'DONE', attempt: expect.any(Number) })),
    );
    expect(await count('select count(*)::int as n from design')).toEqual([{ n: 3 }]);
    expect(
      await count(
        "select count(*)::int as n, count(distinct subject_id)::int as designs from history where action = 'design.computed'",
      ),
    ).toEqual([{ n: 3, designs: 3 }]);
    await expect
      .poll(() => count('select count(*)::int as n from graphile_worker.jobs'), { timeout: RECOVERY_MS })
      .toEqual([{ n: 0 }]);
    expect(workerLog.match(/"stored":true/g)).toHaveLength(3);
  });
});
