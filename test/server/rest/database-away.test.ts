import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { type CutLine, openLine } from '../../support/cut-line.ts';
import { startNext } from './computing.ts';
import { type Service, startService } from './service.ts';

let service: Service;
let line: CutLine;

beforeAll(async () => {
  service = await startService({
    databaseUrl: async (url) => {
      line = await openLine(url);
      return line.url;
    },
  });
  expect((await service.registerChip('AWAY-1')).status).toBe(201);
});
afterAll(async () => {
  line?.mend();
  await service?.stop();
  await line?.close();
});

const asking = {
  chip: 'AWAY-1',
  specification: {
    family: { family: 'BUTTERWORTH', shape: 'LOW_PASS', order: 3, band: { offsetGhz: { low: -6, high: 6 } } },
  },
};
const pause = (ms: number) => new Promise((resolve) => setTimeout(resolve, ms));

/** Reconnecting takes at most 5 s (the store's longest delay); twice that on a busy machine. */
const RECOVERY_MS = 10_000;

async function until(holds: () => Promise<boolean>): Promise<void> {
  const end = performance.now() + RECOVERY_MS;
  while (!(await holds())) {
    if (performance.now() > end) throw new Error('did not recover');
    await pause(100);
  }
}

describe('while the database is away', () => {
  it('requests are 503 with Retry-After, long polls end, and everything goes on afterwards; nothing is lost', async () => {
    const asked = await service.call('/v1/design-requests', { method: 'POST', body: asking });
    const location = asked.headers.get('location')!;
    const etag = asked.headers.get('etag')!;
    const poll = service.call(location, { headers: { 'if-none-match': etag, prefer: 'wait=30' } });
    await pause(200);

    line.cut();
    const ended = await poll;
    expect([ended.status, ended.json.code]).toEqual([503, 'SERVICE_UNAVAILABLE']);
    for (const [method, path, body] of [
      ['GET', '/v1/chips', undefined],
      ['GET', '/v1/chips/AWAY-1/releases/current.csv', undefined],
      ['POST', '/v1/design-requests', asking],
    ] as const) {
      const began = performance.now();
      const answer = await service.call(path, { method, body });
      expect([path, answer.status, answer.json?.code]).toEqual([path, 503, 'SERVICE_UNAVAILABLE']);
      expect(answer.headers.get('retry-after')).toMatch(/^\d+$/);
      expect(answer.headers.get('content-type')).toBe('application/problem+json');
      expect(answer.text).not.toMatch(/ECONN|postgres|127\.0\.0\.1/);
      expect(performance.now() - began).toBeLessThan(5000);
    }
    expect((await service.call('/readyz', { token: null })).status).toBe(503);
    expect((await service.call('/healthz', { token: null })).status).toBe(200);
    expect((await service.call('/metrics', { token: null })).text).toMatch(/ringbinder_database_up 0/);
    await pause(3000);

    line.mend();
    await until(async () => (await service.call('/readyz', { token: null })).status === 200);
    await until(async () => service.store.notifications.connected);
    const kept = await service.call(location);
    expect([kept.status, kept.json.state]).toEqual([200, 'QUEUED']);

    const waiting = service.call(location, {
      headers: { 'if-none-match': kept.headers.get('etag')!, prefer: 'wait=20' },
    });
    await pause(200);
    const computing = await startNext(service.store);
    expect((await waiting).json.state).toBe('RUNNING');
    await computing.finish();
    expect((await service.call(location)).json.state).toBe('DONE');
  });
});

describe('while the service shuts down', () => {
  it('open long polls are answered at once with what is', async () => {
    const other = await startService();
    await other.registerChip('AWAY-2');
    const asked = await other.call('/v1/design-requests', {
      method: 'POST',
      body: { ...asking, chip: 'AWAY-2' },
    });
    const location = asked.headers.get('location')!;
    const poll = other.call(location, {
      headers: { 'if-none-match': asked.headers.get('etag')!, prefer: 'wait=60' },
    });
    const first = other.call('/v1/chips/AWAY-2/releases/current', { headers: { prefer: 'wait=60' } });
    await pause(200);
    const began = performance.now();
    await other.stop();
    expect((await poll).status).toBe(304);
    expect((await first).status).toBe(404);
    expect(performance.now() - began).toBeLessThan(10_000);
  });
});
