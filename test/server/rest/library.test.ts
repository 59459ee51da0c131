import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { startNext } from './computing.ts';
import { inventedChip } from './invented-chips.ts';
import { type Answer, type Service, startService } from './service.ts';

let service: Service;
const designs: string[] = [];

const asking = (edgeGhz: number) => ({
  chip: 'LIB-1',
  specification: {
    family: {
      family: 'BUTTERWORTH',
      shape: 'LOW_PASS',
      order: 3,
      band: { offsetGhz: { low: -edgeGhz, high: edgeGhz } },
    },
  },
});
const pause = (ms: number) => new Promise((resolve) => setTimeout(resolve, ms));

async function newDesign(edgeGhz: number): Promise<string> {
  const asked = await service.call('/v1/design-requests', { method: 'POST', body: asking(edgeGhz) });
  expect(asked.status, asked.text).toBe(202);
  await (await startNext(service.store)).finish();
  const done = await service.call(asked.headers.get('location')!);
  expect(done.json.state, done.text).toBe('DONE');
  return done.json.design;
}

beforeAll(async () => {
  service = await startService();
  expect((await service.registerChip('LIB-1')).status).toBe(201);
  for (const edge of [5, 8]) designs.push(await newDesign(edge));
});
afterAll(() => service?.stop());

const save = (name: string, body: object, headers: Record<string, string> = {}): Promise<Answer> =>
  service.call(`/v1/chips/LIB-1/configurations/${name}/versions`, { method: 'POST', body, headers });
const publish = (name: string, body: object, headers: Record<string, string> = {}): Promise<Answer> =>
  service.call(`/v1/chips/LIB-1/releases/${name}`, { method: 'PUT', body, headers });
const pull = (name: string, headers: Record<string, string> = {}): Promise<Answer> =>
  service.call(`/v1/chips/LIB-1/releases/${name}`, { headers, token: service.tokens.INSTRUMENT });

/** Every caution of the version, as a careful person would name them after reading. */
async function publishAll(
  name: string,
  configuration: string,
  version: number,
  headers: Record<string, string> = {},
): Promise<Answer> {
  const first = await publish(name, { configuration, version }, headers);
  if (first.json?.code !== 'CAUTION_NOT_ACCEPTED') return first;
  return publish(name, { configuration, version, accept: first.json.allowed }, headers);
}

describe('chips', () => {
  it('register once, with a tag that names the revision', async () => {
    const made = await service.registerChip('LIB-2');
    expect([made.status, made.headers.get('location')]).toEqual([201, '/v1/chips/LIB-2']);
    expect(made.headers.get('etag')).toMatch(/^"1\.[0-9a-f]{12}\.json1"$/);
    const again = await service.registerChip('LIB-2');
    expect([again.status, again.json.code]).toEqual([412, 'PRECONDITION_FAILED']);
    expect(again.json.allowed).toEqual({ etag: made.headers.get('etag') });
  });

  it('register again with the same idempotency key as one', async () => {
    const ask = {
      method: 'PUT',
      headers: { 'if-none-match': '*', 'idempotency-key': 'chip-key' },
      body: { model: inventedChip() },
    };
    const first = await service.call('/v1/chips/LIB-3', ask);
    const again = await service.call('/v1/chips/LIB-3', ask);
    expect([first.status, again.status, again.text]).toEqual([201, 200, first.text]);
  });

  it('revise with the tag that was read: 428 without, 412 with another, 200 with it', async () => {
    const read = await service.call('/v1/chips/LIB-2');
    const body = { model: inventedChip({ fsrGhz: 51 }), note: 'measured again' };
    const put = (headers: Record<string, string>) =>
      service.call('/v1/chips/LIB-2', { method: 'PUT', headers, body });
    const none = await put({});
    expect([none.status, none.json.code]).toEqual([428, 'PRECONDITION_REQUIRED']);
    expect((await put({ 'if-match': '"9.000000000000.json1"' })).status).toBe(412);
    // RFC 9110 section 13.1.1: If-Match compares strongly, so that a weak tag never matches.
    expect((await put({ 'if-match': `W/${read.headers.get('etag')}` })).status).toBe(412);
    const revised = await put({ 'if-match': read.headers.get('etag')! });
    expect([revised.status, revised.json.head.number]).toEqual([200, 2]);
    const same = await put({ 'if-match': revised.headers.get('etag')! });
    expect([same.status, same.json.head.number, same.headers.get('etag')]).toEqual([
      200,
      2,
      revised.headers.get('etag'),
    ]);
    expect(
      (await service.call('/v1/chips/LIB-404', { method: 'PUT', headers: { 'if-match': '*' }, body })).status,
    ).toBe(412);
  });

  it('keep every revision', async () => {
    const page = await service.call('/v1/chips/LIB-2/revisions');
    expect(page.json.edges.map(({ node }: { node: { number: number } }) => node.number)).toEqual([2, 1]);
    const first = await service.call('/v1/chips/LIB-2/revisions/1');
    expect(first.json).toMatchObject({ number: 1, model: { input: inventedChip() } });
    const again = await service.call('/v1/chips/LIB-2/revisions/1', {
      headers: { 'if-none-match': first.headers.get('etag')! },
    });
    expect(again.status).toBe(304);
    for (const number of ['0', '3', 'x', '1.5', '99999999999']) {
      expect([number, (await service.call(`/v1/chips/LIB-2/revisions/${number}`)).status]).toEqual([
        number,
        404,
      ]);
    }
  });

  // RFC 9110 section 13.2.1: 404 stays 404 whatever the preconditions say.
  it('[published] are 404 before any precondition', async () => {
    expect((await service.call('/v1/chips/LIB-404', { headers: { 'if-none-match': '*' } })).status).toBe(404);
    expect((await service.call('/v1/chips/LIB-404', { headers: { 'if-match': '"x"' } })).status).toBe(404);
  });
});

describe('versions', () => {
  it('are numbered from 1, each where its Location says', async () => {
    for (const number of [1, 2]) {
      const saved = await save('il50', { design: designs[number - 1], note: `take ${number}` });
      expect([saved.status, saved.json.number], saved.text).toEqual([201, number]);
      expect(saved.headers.get('location')).toBe(`/v1/chips/LIB-1/configurations/il50/versions/${number}`);
      const sheet = await service.call(saved.headers.get('location')!);
      expect([sheet.status, sheet.headers.get('etag')]).toEqual([200, saved.headers.get('etag')]);
    }
    const configuration = await service.call('/v1/chips/LIB-1/configurations/il50');
    expect(configuration.json).toMatchObject({
      name: 'il50',
      lastVersion: 2,
      latest: { number: 2, stale: false },
    });
    const list = await service.call('/v1/chips/LIB-1/configurations/il50/versions');
    expect(list.json.edges.map(({ node }: { node: { number: number } }) => node.number)).toEqual([2, 1]);
  });

  it('are saved over the version that was seen, or not at all', async () => {
    const body = { design: designs[0] };
    expect((await save('careful', body, { 'if-none-match': '*' })).status).toBe(201);
    const second = await save('careful', body, { 'if-none-match': '*' });
    expect([second.status, second.json.code, second.json.allowed]).toEqual([
      412,
      'PRECONDITION_FAILED',
      { etag: '"1"' },
    ]);
    expect((await save('careful', body, { 'if-match': '"1"' })).status).toBe(201);
    expect((await save('careful', body, { 'if-match': '"1"' })).status).toBe(412);
    const { headers } = await service.call('/v1/chips/LIB-1/configurations/careful');
    expect((await save('careful', body, { 'if-match': headers.get('etag')! })).status).toBe(201);
  });

  it('of two savers with the same expectation one wins', async () => {
    await save('race', { design: designs[0] });
    const both = await Promise.all(
      [1, 2].map(() => save('race', { design: designs[1] }, { 'if-match': '"1"' })),
    );
    expect(both.map(({ status }) => status).sort()).toEqual([201, 412]);
  });

  it('are saved once under one idempotency key, even when the precondition no longer holds', async () => {
    await save('keyed', { design: designs[0] });
    const headers = { 'if-match': '"1"', 'idempotency-key': 'version-key' };
    const first = await save('keyed', { design: designs[1] }, headers);
    const again = await save('keyed', { design: designs[1] }, headers);
    expect([first.status, again.status, again.json.number]).toEqual([201, 200, 2]);
    const other = await save('keyed', { design: designs[0] }, headers);
    expect([other.status, other.json.code]).toEqual([422, 'IDEMPOTENCY_KEY_REUSED']);
  });

  it('come as a sheet of every channel, in JSON and in CSV', async () => {
    const csv = await service.call('/v1/chips/LIB-1/configurations/il50/versions/1.csv');
    expect(csv.headers.get('content-type')).toBe('text/csv; charset=utf-8; header=present');
    const lines = csv.text.split('\r\n');
    expect(lines[0]).toBe(
      'sheet,chip,chipRevision,configuration,version,release,sequence,channelCount,channel,drives,state,currentMa,powerMw,phaseRad,limitMa,temperatureC',
    );
    const count = inventedChip().channels.length;
    expect(lines.length).toBe(count + 2);
    expect(lines[1]).toMatch(new RegExp(`^1,LIB-1,1,il50,1,,,${count},01,cell1\\.input\\.coupling,`));
    const json = await service.call('/v1/chips/LIB-1/configurations/il50/versions/1.json');
    expect(json.json.channels.length).toBe(count);
    const accepted = await service.call('/v1/chips/LIB-1/configurations/il50/versions/1', {
      headers: { accept: 'text/csv' },
    });
    expect([accepted.text, accepted.headers.get('etag')]).toEqual([csv.text, csv.headers.get('etag')]);
    expect((await service.call('/v1/chips/LIB-1/configurations/il50/versions/9.csv')).status).toBe(404);
  });

  it('are refused for a design of an older chip revision', async () => {
    const { json, headers } = await service.registerChip('LIB-4');
    expect(json.head.number).toBe(1);
    const asked = await service.call('/v1/design-requests', {
      method: 'POST',
      body: { ...asking(5), chip: 'LIB-4' },
    });
    await (await startNext(service.store)).finish();
    const { design } = (await service.call(asked.headers.get('location')!)).json;
    await service.call('/v1/chips/LIB-4', {
      method: 'PUT',
      headers: { 'if-match': headers.get('etag')! },
      body: { model: inventedChip({ fsrGhz: 49 }) },
    });
    const refused = await service.call('/v1/chips/LIB-4/configurations/il50/versions', {
      method: 'POST',
      body: { design },
    });
    expect([refused.status, refused.json.code]).toEqual([409, 'STALE_CHIP_REVISION']);
  });
});

describe('releases', () => {
  it('are 404 until the first, and pulled by instruments afterwards', async () => {
    expect((await pull('current')).status).toBe(404);
    const published = await publishAll('current', 'il50', 1, { 'if-none-match': '*' });
    expect([published.status, published.json.sequence], published.text).toEqual([201, 1]);
    const pulled = await pull('current');
    expect(pulled.status).toBe(200);
    expect(pulled.headers.get('etag')).toMatch(/^"1\.[0-9a-f]{12}\.json1"$/);
    expect(pulled.headers.get('etag')).toBe(published.headers.get('etag'));
    expect(pulled.json).toMatchObject({
      chip: 'LIB-1',
      configuration: 'il50',
      version: 1,
      release: 'current',
      sequence: 1,
    });
    const csv = await pull('current.csv');
    expect(csv.headers.get('etag')).toBe(pulled.headers.get('etag')!.replace('json1', 'csv1'));
    expect(csv.text.split('\r\n')[1]).toMatch(/^1,LIB-1,1,il50,1,current,1,/);
  });

  // RFC 9110 sections 13.1.2 and 8.8.3.2: If-None-Match compares weakly and may hold a list.
  it('[published] are 304 while they are the ones that are known, with ETag, Vary and Cache-Control', async () => {
    const pulled = await pull('current.csv');
    const etag = pulled.headers.get('etag')!;
    for (const known of [etag, `W/${etag}`, `"other", ${etag}`, '*']) {
      const again = await pull('current.csv', { 'if-none-match': known });
      expect([known, again.status, again.text]).toEqual([known, 304, '']);
      for (const name of ['etag', 'vary', 'cache-control'])
        expect(again.headers.get(name)).toBe(pulled.headers.get(name));
    }
    // The JSON tag names other bytes.
    expect((await pull('current.json', { 'if-none-match': etag })).status).toBe(200);
  });

  it('need their cautions accepted, each by its code', async () => {
    const bare = await publish('strict', { configuration: 'il50', version: 1 });
    expect([bare.status, bare.json.code], bare.text).toEqual([409, 'CAUTION_NOT_ACCEPTED']);
    expect(bare.json.errors.length).toBeGreaterThan(0);
    expect((await pull('strict')).status).toBe(404);
  });

  it('are published over the release that was seen, or not at all', async () => {
    const seen = (await pull('current.csv')).headers.get('etag')!;
    expect((await publishAll('current', 'il50', 2, { 'if-none-match': '*' })).status).toBe(412);
    const second = await publishAll('current', 'il50', 2, { 'if-match': seen });
    expect([second.status, second.json.sequence], second.text).toEqual([200, 2]);
    const late = await publishAll('current', 'il50', 1, { 'if-match': seen });
    expect([late.status, late.json.code]).toEqual([412, 'PRECONDITION_FAILED']);
    expect(late.json.allowed).toEqual({ etag: second.headers.get('etag') });
  });

  it('go back by publishing an older version, and the log keeps all', async () => {
    const back = await publishAll('current', 'il50', 1);
    expect([back.status, back.json.sequence]).toEqual([200, 3]);
    const log = await service.call('/v1/chips/LIB-1/releases/current/log');
    expect(log.json.edges.map(({ node }: { node: { version: number } }) => node.version)).toEqual([1, 2, 1]);
    const all = await service.call('/v1/chips/LIB-1/releases');
    expect(
      all.json.releases.map(({ name, sequence }: { name: string; sequence: number }) => [name, sequence]),
    ).toEqual([['current', 3]]);
  });

  it('take no name that ends like a representation', async () => {
    const answer = await publish('current.csv', { configuration: 'il50', version: 1 });
    expect([answer.status, answer.json.pointer]).toEqual([400, '/name']);
  });
});

describe('waiting for a release', () => {
  it('ends with the next one, in whichever representation is asked for', async () => {
    const known = (await pull('current.csv')).headers.get('etag')!;
    const waiting = pull('current.csv', { 'if-none-match': known, prefer: 'wait=20' });
    await pause(100);
    const next = await publishAll('current', 'il50', 2);
    const answer = await waiting;
    expect([answer.status, answer.headers.get('preference-applied')]).toEqual([200, 'wait=20']);
    expect(answer.text).toContain(`,current,${next.json.sequence},`);
  });

  it('ends with the first one', async () => {
    const waiting = pull('first', { prefer: 'wait=20' });
    await pause(100);
    await publishAll('first', 'il50', 1);
    expect((await waiting).json).toMatchObject({ release: 'first', sequence: 1 });
  });

  it('is 404 or 304 at the end of the wait, and clamped to 60 s', async () => {
    const none = await pull('never', { prefer: 'wait=1' });
    expect([none.status, none.headers.get('preference-applied')]).toEqual([404, 'wait=1']);
    const known = (await pull('current')).headers.get('etag')!;
    const same = await pull('current', { prefer: 'wait=1', 'if-none-match': known });
    expect([same.status, same.headers.get('preference-applied')]).toEqual([304, 'wait=1']);
    const clamped = await pull('current', { prefer: 'wait=3600' });
    expect([clamped.status, clamped.headers.get('preference-applied')]).toEqual([200, 'wait=60']);
  });

  it('does not wait for a chip that does not exist', async () => {
    const began = performance.now();
    const answer = await service.call('/v1/chips/LIB-404/releases/current', {
      headers: { prefer: 'wait=20' },
    });
    expect(answer.status).toBe(404);
    expect(performance.now() - began).toBeLessThan(2000);
  });
});

describe('history', () => {
  it('tells who did what, newest first', async () => {
    const page = await service.call('/v1/history?chip=LIB-1&first=5');
    expect(page.status, page.text).toBe(200);
    expect(page.json.edges[0].node).toMatchObject({ actor: { name: 'invented designer' }, chip: 'LIB-1' });
    const later = await service.call(`/v1/history?until=2020-01-01T00:00:00Z`);
    expect(later.json.edges).toEqual([]);
  });
});
