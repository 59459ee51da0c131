import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { isAnythingQueued, startNext } from './computing.ts';
import { inventedChip } from './invented-chips.ts';
import { type Answer, type Ask, type Service, startService } from './service.ts';

let service: Service;

beforeAll(async () => {
  service = await startService();
  expect((await service.registerChip('REQ-1')).status).toBe(201);
});
afterAll(() => service?.stop());

/** Different edges, different questions. */
const asking = (edgeGhz: number) => ({
  chip: 'REQ-1',
  specification: {
    family: {
      family: 'BUTTERWORTH',
      shape: 'LOW_PASS',
      order: 3,
      band: { offsetGhz: { low: -edgeGhz, high: edgeGhz } },
    },
  },
});
const post = (body: unknown, headers: Record<string, string> = {}, ask: Ask = {}): Promise<Answer> =>
  service.call('/v1/design-requests', { method: 'POST', body, headers, ...ask });
const pause = (ms: number) => new Promise((resolve) => setTimeout(resolve, ms));

describe('asking for a design', () => {
  it('is 202 with a place to look, then 200 with the design where it is, then answered from the store', async () => {
    const asked = await post(asking(5));
    expect(asked.status, asked.text).toBe(202);
    expect(asked.headers.get('retry-after')).toBe('1');
    const location = asked.headers.get('location')!;
    expect(location).toBe(`/v1/design-requests/${asked.json.id}`);
    expect(asked.json).toMatchObject({
      state: 'QUEUED',
      progress: 0,
      cached: false,
      chip: 'REQ-1',
      chipRevision: 1,
      asked: asking(5),
    });

    await (await startNext(service.store)).finish();
    const done = await service.call(location);
    expect(done.json).toMatchObject({ state: 'DONE', progress: 1, problem: null });
    const design = await service.call(`/v1/designs/${done.json.design}`);
    expect(design.status).toBe(200);

    const again = await post(asking(5));
    expect(again.status).toBe(200);
    expect(again.headers.get('content-location')).toBe(`/v1/designs/${done.json.design}`);
    expect(again.headers.get('etag')).toBe(design.headers.get('etag'));
    expect(again.text).toBe(design.text);
    const cached = await service.call(again.headers.get('location')!);
    expect(cached.json).toMatchObject({
      state: 'DONE',
      cached: true,
      createdBy: null,
      design: done.json.design,
    });
  });

  it('answers the design itself when it is finished within the wait', async () => {
    const waiting = post(asking(6), { prefer: 'wait=20' });
    await (await startNext(service.store)).finish();
    const answer = await waiting;
    expect([answer.status, answer.headers.get('preference-applied')], answer.text).toEqual([200, 'wait=20']);
    expect(answer.headers.get('content-location')).toBe(`/v1/designs/${answer.json.id}`);
  });

  it('is 202 when the wait ends first, and says what wait was granted', async () => {
    const began = performance.now();
    const answer = await post(asking(7), { prefer: 'respond-async, wait=1' });
    expect([answer.status, answer.headers.get('preference-applied')]).toEqual([202, 'wait=1']);
    expect(performance.now() - began).toBeGreaterThan(950);
    await (await startNext(service.store)).finish();
  });

  it('is 422 with the stored problem and the request as its instance when it fails within the wait', async () => {
    const waiting = post(asking(7.5), { prefer: 'wait=20' });
    await (await startNext(service.store)).fail();
    const answer = await waiting;
    expect(answer.headers.get('content-type')).toBe('application/problem+json');
    expect(answer.json.code).toBe('COMPUTATION_TIMED_OUT');
    expect(answer.status).toBe(answer.json.status);
    expect(answer.json.instance).toMatch(/^\/v1\/design-requests\/req_/);
    const stored = await service.call(answer.json.instance);
    expect([stored.status, stored.json.state, stored.json.problem.code]).toEqual([
      200,
      'FAILED',
      'COMPUTATION_TIMED_OUT',
    ]);
  });

  it('lets two ask the same and computes once', async () => {
    const [first, second] = await Promise.all([
      post(asking(8)),
      post(asking(8), {}, { token: service.tokens.ADMIN }),
    ]);
    expect([first.status, second.status]).toEqual([202, 202]);
    expect(first.json.id).not.toBe(second.json.id);
    await (await startNext(service.store)).finish();
    expect(await isAnythingQueued(service.store)).toBe(false);
    for (const { headers } of [first, second]) {
      expect((await service.call(headers.get('location')!)).json.state).toBe('DONE');
    }
  });
});

describe('idempotency keys', () => {
  it('answer the same request again in its present state, and refuse another body', async () => {
    const key = { 'idempotency-key': 'req-key-1' };
    const first = await post(asking(9), key);
    const again = await post(asking(9), { 'idempotency-key': '"req-key-1"' });
    expect([first.status, again.status, again.json.id]).toEqual([202, 202, first.json.id]);
    await (await startNext(service.store)).finish();
    const done = await post(asking(9), key);
    expect([done.status, done.headers.get('location')]).toEqual([200, first.headers.get('location')]);
    const other = await post(asking(9.5), key);
    expect([other.status, other.json.code]).toEqual([422, 'IDEMPOTENCY_KEY_REUSED']);
  });
});

describe('cancelling', () => {
  it("ends the own request, repeats, and refuses what has ended or is another's", async () => {
    const asked = await post(asking(10));
    const path = `${asked.headers.get('location')}/cancel`;
    const other = await service.newToken('DESIGNER', undefined, 'another designer');
    expect((await service.call(path, { method: 'POST', token: other.token })).status).toBe(403);
    expect((await service.call(path, { method: 'POST', token: service.tokens.READER })).status).toBe(403);
    for (let i = 0; i < 2; i++) {
      const cancelled = await service.call(path, { method: 'POST' });
      expect([cancelled.status, cancelled.json.state]).toEqual([200, 'CANCELLED']);
    }
    expect(await isAnythingQueued(service.store)).toBe(false);

    const finished = await post(asking(10.5));
    await (await startNext(service.store)).finish();
    const late = await service.call(`${finished.headers.get('location')}/cancel`, { method: 'POST' });
    expect([late.status, late.json.code]).toEqual([409, 'ALREADY_FINISHED']);
  });

  it('wakes whoever waits for the request', async () => {
    const asked = await post(asking(11));
    const location = asked.headers.get('location')!;
    const seen = await service.call(location);
    const poll = service.call(location, {
      headers: { 'if-none-match': seen.headers.get('etag')!, prefer: 'wait=20' },
    });
    await pause(100);
    await service.call(`${location}/cancel`, { method: 'POST' });
    expect((await poll).json).toMatchObject({ state: 'CANCELLED' });
  });
});

describe('long polls', () => {
  it('answer when progress moves, 304 at the end of the wait, and at once when the request has ended', async () => {
    const asked = await post(asking(12));
    const location = asked.headers.get('location')!;
    const poll = (etag: string, seconds: number) =>
      service.call(location, { headers: { 'if-none-match': etag, prefer: `wait=${seconds}` } });
    const queued = (await service.call(location)).headers.get('etag')!;

    const started = poll(queued, 20);
    await pause(100);
    const computing = await startNext(service.store);
    const running = await started;
    expect([running.status, running.json.state]).toEqual([200, 'RUNNING']);

    const moving = poll(running.headers.get('etag')!, 20);
    await pause(50);
    await computing.progress(0.5);
    const moved = await moving;
    expect(moved.json).toMatchObject({ state: 'RUNNING', progress: 0.5 });

    const still = await poll(moved.headers.get('etag')!, 1);
    expect([still.status, still.headers.get('preference-applied')]).toEqual([304, 'wait=1']);

    await computing.finish();
    const done = await poll(moved.headers.get('etag')!, 20);
    expect([done.status, done.json.state]).toEqual([200, 'DONE']);
    const began = performance.now();
    expect((await poll(done.headers.get('etag')!, 20)).status).toBe(304);
    expect(performance.now() - began).toBeLessThan(2000);
  });

  it('end with 401 when the token is revoked meanwhile', async () => {
    const asked = await post(asking(13));
    const { token, id } = await service.newToken('READER');
    const location = asked.headers.get('location')!;
    const etag = (await service.call(location)).headers.get('etag')!;
    const poll = service.call(location, { token, headers: { 'if-none-match': etag, prefer: 'wait=20' } });
    await pause(100);
    await service.revoke(id);
    expect((await poll).status).toBe(401);
    await (await startNext(service.store)).finish();
  });

  it('are 20 a token at most, and one that was left makes room', async () => {
    const asked = await post(asking(14));
    const location = asked.headers.get('location')!;
    const etag = (await service.call(location)).headers.get('etag')!;
    const left = new AbortController();
    const headers = { 'if-none-match': etag, prefer: 'wait=30' };
    const polls = Array.from({ length: 20 }, () =>
      service.call(location, { headers, signal: left.signal }).catch(() => 'left'),
    );
    await pause(300);
    const refused = await service.call(location, { headers });
    expect([refused.status, refused.json?.code]).toEqual([429, 'TOO_MANY_OPEN']);
    left.abort();
    await Promise.all(polls);
    await pause(100);
    const granted = await service.call(location, { headers: { ...headers, prefer: 'wait=1' } });
    expect(granted.status).toBe(304);
    await (await startNext(service.store)).finish();
  });
});

describe('lists', () => {
  it('continue by their Link until every request was seen once, newest first', async () => {
    const seen: string[] = [];
    let path: string | undefined = '/v1/design-requests?first=3&chip=REQ-1';
    let pages = 0;
    while (path !== undefined) {
      const page: Answer = await service.call(path);
      expect(page.status, page.text).toBe(200);
      seen.push(...page.json.edges.map(({ node }: { node: { id: string } }) => node.id));
      path = /^<([^>]+)>; rel="next"$/.exec(page.headers.get('link') ?? '')?.[1];
      expect(path !== undefined).toBe(page.json.pageInfo.hasNextPage);
      pages += 1;
      expect(pages).toBeLessThan(20);
    }
    expect(new Set(seen).size).toBe(seen.length);
    expect(seen.length).toBeGreaterThan(9);
    const times = await service.call(`/v1/design-requests?first=200`);
    const created = times.json.edges.map(({ node }: { node: { createdAt: string } }) => node.createdAt);
    expect(created).toEqual([...created].sort().reverse());
  });

  it('filter by state and by who asked', async () => {
    const failed = await service.call('/v1/design-requests?state=FAILED,CANCELLED');
    const states = failed.json.edges.map(({ node }: { node: { state: string } }) => node.state);
    expect(new Set(states)).toEqual(new Set(['FAILED', 'CANCELLED']));
    const mine = await service.call('/v1/design-requests?mine=true', { token: service.tokens.READER });
    expect(mine.json.edges).toEqual([]);
  });
});

describe('a stale chip revision', () => {
  it('is 409 and offers the same body at the head', async () => {
    const read = await service.call('/v1/chips/REQ-1');
    const revised = await service.call('/v1/chips/REQ-1', {
      method: 'PUT',
      headers: { 'if-match': read.headers.get('etag')! },
      body: { model: inventedChip({ fsrGhz: 60 }) },
    });
    expect([revised.status, revised.json.head.number]).toEqual([200, 2]);
    const stale = await post({ ...asking(5), chipRevision: 1 });
    expect([stale.status, stale.json.code]).toEqual([409, 'STALE_CHIP_REVISION']);
    expect(stale.json.nearest[0].input).toEqual({ ...asking(5), chipRevision: 2 });
    const atHead = await post(stale.json.nearest[0].input);
    expect(atHead.status).toBe(202);
    await (await startNext(service.store)).finish();
  });
});
