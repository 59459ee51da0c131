import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import WebSocket from 'ws';
import type { Notifications } from '../../../server/store/index.ts';
import { openLine as openDatabaseLine } from '../../support/cut-line.ts';
import { startNext } from '../rest/computing.ts';
import { openLine, read } from './ask.ts';
import { type Lab, openLab, publishRelease, requestDesign, SERIAL, SPECIFICATION } from './lab.ts';
import { type Second, startSecond } from './second.ts';

let lab: Lab;
let second: Second;
let databaseLine: Awaited<ReturnType<typeof openDatabaseLine>>;

beforeAll(async () => {
  let databaseUrl = '';
  lab = await openLab({
    databaseUrl: async (url) => {
      databaseUrl = url;
      return url;
    },
  });
  databaseLine = await openDatabaseLine(databaseUrl);
  second = await startSecond(databaseLine.url);
});
afterAll(async () => {
  await second?.stop();
  await databaseLine?.close();
  await lab?.service.stop();
});

const WATCH =
  'subscription ($id: ID!) { designRequestChanged(id: $id) { id state progress design { id } problem { code } } }';
const RELEASES =
  'subscription ($chip: String!) { releasePublished(chip: $chip) { name sequence current version { number } } }';
const token = () => lab.service.tokens.DESIGNER;

let asked = 0;
/** A specification nobody asked for yet. */
function another() {
  asked += 1;
  return { family: { ...SPECIFICATION.family, rippleDb: 0.1 + asked / 100 } };
}

describe('a design request', () => {
  it('is told as it is, then as it changes by another process, until it has ended', async () => {
    const id = await requestDesign(lab.service, another());
    const line = openLine(second.url, { token: token() });
    const events = line.follow(WATCH, { id });
    const next = async () => (await events.next()).value?.data.designRequestChanged;
    expect(await next()).toMatchObject({ id, state: 'QUEUED', progress: 0, design: null });
    const computing = await startNext(lab.service.store);
    expect(await next()).toMatchObject({ state: 'RUNNING', progress: 0 });
    await computing.progress(0.5);
    expect(await next()).toMatchObject({ state: 'RUNNING', progress: 0.5 });
    await computing.finish();
    expect(await next()).toMatchObject({
      state: 'DONE',
      progress: 1,
      design: { id: expect.stringMatching(/^dsn_/) },
    });
    expect(await events.next()).toMatchObject({ done: true });
    await line.client.dispose();
  });

  it('that has ended is told once, the token in the header of the upgrade', async () => {
    const line = openLine(lab.service.url, { token: token(), by: 'HEADER' });
    const seen = [];
    for await (const event of line.follow(WATCH, { id: lab.requestId }))
      seen.push(event.data.designRequestChanged);
    expect(seen).toMatchObject([{ state: 'DONE', design: { id: lab.designId } }]);
    await line.client.dispose();
  });

  it('that is not there is NOT_FOUND', async () => {
    const line = openLine(lab.service.url, { token: token() });
    const { value } = await line.follow(WATCH, { id: 'req_none' }).next();
    expect(value.errors[0].extensions).toMatchObject({ code: 'NOT_FOUND', pointer: '/id' });
    await line.client.dispose();
  });

  it('cancelled elsewhere ends the watch', async () => {
    const id = await requestDesign(lab.service, another());
    const line = openLine(second.url, { token: token() });
    const events = line.follow(WATCH, { id });
    await events.next();
    const cancel = 'mutation ($id: ID!) { cancelDesignRequest(input: {id: $id}) { request { state } } }';
    await read(lab.service, cancel, { variables: { id } });
    expect((await events.next()).value.data.designRequestChanged.state).toBe('CANCELLED');
    expect((await events.next()).done).toBe(true);
    await line.client.dispose();
  });
});

describe('releases of a chip', () => {
  it('are told one by one across processes, the present one first', async () => {
    const line = openLine(second.url, { token: lab.service.tokens.INSTRUMENT });
    const events = line.follow(RELEASES, { chip: SERIAL });
    const next = async () => (await events.next()).value.data.releasePublished;
    expect(await next()).toMatchObject({ name: 'current', sequence: 1, current: true });
    const accept = await acceptAll();
    await publishRelease(lab.service, 1, accept);
    expect(await next()).toMatchObject({ sequence: 2 });
    await Promise.all([publishRelease(lab.service, 1, accept), publishRelease(lab.service, 1, accept)]);
    expect([(await next()).sequence, (await next()).sequence]).toEqual([3, 4]);
    await line.client.dispose();
  });

  it('published while the database was away are told when it is back', async () => {
    const line = openLine(second.url, { token: token() });
    const events = line.follow(RELEASES, { chip: SERIAL });
    const { sequence } = (await events.next()).value.data.releasePublished;
    databaseLine.cut();
    const accept = await acceptAll();
    await publishRelease(lab.service, 1, accept);
    await publishRelease(lab.service, 1, accept);
    databaseLine.mend();
    const told = [await events.next(), await events.next()];
    expect(told.map(({ value }) => value.data.releasePublished.sequence)).toEqual([
      sequence + 1,
      sequence + 2,
    ]);
    await line.client.dispose();
  });
});

async function acceptAll(): Promise<string[]> {
  const query =
    'query ($id: ID!) { node(id: $id) { ... on ConfigurationVersion { setting { cautions { code } } } } }';
  const { node } = await read(lab.service, query, { variables: { id: lab.versionId } });
  return ['MASK_NOT_MET', ...node.setting.cautions.map((caution: { code: string }) => caution.code)];
}

/** Counts those that come from now on. */
function countListeners(notifications: Notifications): () => number {
  let open = 0;
  const subscribe = notifications.subscribe.bind(notifications);
  Object.assign(notifications, {
    subscribe(listener: Parameters<typeof subscribe>[0]) {
      const unsubscribe = subscribe(listener);
      let isOpen = true;
      open += 1;
      return () => {
        if (isOpen) open -= 1;
        isOpen = false;
        unsubscribe();
      };
    },
  });
  return () => open;
}

it('while the database is away operations fail with 503 and when to come back, then go on', async () => {
  const post = () =>
    fetch(`${second.url}/graphql`, {
      method: 'POST',
      headers: { 'content-type': 'application/json', authorization: `Bearer ${token()}` },
      body: JSON.stringify({ query: '{ chips { edges { node { serial } } } }' }),
    });
  expect((await post()).status).toBe(200);
  databaseLine.cut();
  const away = await post();
  expect([away.status, away.headers.get('retry-after')]).toEqual([503, '2']);
  const { errors } = (await away.json()) as { errors: { extensions: { code: string } }[] };
  expect(errors.map(({ extensions }) => extensions.code)).toEqual(['SERVICE_UNAVAILABLE']);
  databaseLine.mend();
  await expect.poll(async () => (await post()).status, { timeout: 10_000 }).toBe(200);
});

describe('a socket', () => {
  const FORBIDDEN = 4403;

  it('is closed when its token is revoked by another process', async () => {
    const { token: secret, id } = await lab.service.newToken('DESIGNER');
    const line = openLine(second.url, { token: secret });
    const events = line.follow(RELEASES, { chip: SERIAL });
    await events.next();
    const end = events.next().catch((error: unknown) => error);
    await lab.service.revoke(id);
    expect(await line.closed).toMatchObject({ code: FORBIDDEN, reason: 'The token has been revoked.' });
    await end;
  });

  it('is closed when its token was revoked while the database was away', async () => {
    const { token: secret, id } = await lab.service.newToken('DESIGNER');
    const line = openLine(second.url, { token: secret });
    const events = line.follow(RELEASES, { chip: SERIAL });
    await events.next();
    const end = events.next().catch((error: unknown) => error);
    databaseLine.cut();
    await lab.service.revoke(id);
    databaseLine.mend();
    expect((await line.closed).code).toBe(FORBIDDEN);
    await end;
  });

  it('is closed when its token expires', async () => {
    const { token: secret } = await lab.service.newToken('READER', new Date(Date.now() + 1500));
    const line = openLine(lab.service.url, { token: secret });
    const events = line.follow(RELEASES, { chip: SERIAL });
    await events.next();
    const end = events.next().catch((error: unknown) => error);
    expect(await line.closed).toMatchObject({ code: FORBIDDEN, reason: 'The token has expired.' });
    await end;
  });

  it('is refused without a token, with a malformed and with an unknown one', async () => {
    const unknown = `rbt_${'a'.repeat(12)}_${'A'.repeat(43)}`;
    for (const wrong of [undefined, 'nonsense', unknown]) {
      const line = openLine(lab.service.url, wrong === undefined ? {} : { token: wrong });
      const end = line
        .follow(RELEASES, { chip: SERIAL })
        .next()
        .catch((error: unknown) => error);
      expect([wrong, (await line.closed).code]).toEqual([wrong, FORBIDDEN]);
      await end;
    }
  });

  it('carries at most 20 subscriptions of a token, whichever socket they came by', async () => {
    const { token: secret } = await lab.service.newToken('READER');
    const lines = [
      openLine(lab.service.url, { token: secret }),
      openLine(lab.service.url, { token: secret }),
    ];
    const open = [];
    for (let i = 0; i < 20; i++) {
      const events = lines[i % 2]!.follow(RELEASES, { chip: SERIAL });
      await events.next();
      open.push(events);
    }
    const refused = await lines[0]!
      .follow(RELEASES, { chip: SERIAL })
      .next()
      .catch((errors: unknown) => errors);
    expect(refused).toMatchObject([{ extensions: { code: 'TOO_MANY_OPEN', allowed: { max: 20 } } }]);
    await open[1]!.return?.();
    const freed = lines[0]!.follow(RELEASES, { chip: SERIAL });
    await expect
      .poll(
        async () =>
          (await lines[0]!
            .follow(RELEASES, { chip: SERIAL })
            .next()
            .catch(() => null)) !== null,
      )
      .toBe(true);
    await freed.return?.();
    for (const line of lines) await line.client.dispose();
  });

  it('answers queries too, with the same limits', async () => {
    const line = openLine(lab.service.url, { token: token() });
    const { value } = await line.follow('{ me { role } chip(serial: "none") { id } }').next();
    expect(value).toEqual({ data: { me: { role: 'DESIGNER' }, chip: null } });
    const deep = `{ chip(serial: "x") ${'{ head { chip '.repeat(7)}{ id }${' } }'.repeat(7)} }`;
    const refused = await line
      .follow(deep)
      .next()
      .catch((errors: unknown) => errors);
    expect(refused).toMatchObject([{ extensions: { code: 'QUERY_TOO_DEEP' } }]);
    await line.client.dispose();
  });

  it('speaks the published protocol: 4406 without it, 4400 for what is no message, 4401 before the greeting [published]', async () => {
    // Close codes of the GraphQL over WebSocket protocol (graphql-transport-ws).
    const codeAfter = (protocol: string[], message: string) =>
      new Promise<number>((resolve) => {
        const socket = new WebSocket(`${lab.service.url.replace('http', 'ws')}/graphql`, protocol);
        socket.on('open', () => socket.send(message));
        socket.on('close', resolve);
        socket.on('error', () => {});
      });
    expect(await codeAfter([], '')).toBe(4406);
    expect(await codeAfter(['graphql-transport-ws'], 'nonsense')).toBe(4400);
    const early = JSON.stringify({ id: '1', type: 'subscribe', payload: { query: '{ me { role } }' } });
    expect(await codeAfter(['graphql-transport-ws'], early)).toBe(4401);
  });

  it('is told that the service stops, which does not wait for it', async () => {
    const third = await startSecond(databaseLine.url);
    const line = openLine(third.url, { token: token() });
    const events = line.follow(RELEASES, { chip: SERIAL });
    await events.next();
    const end = events.next().catch((error: unknown) => error);
    const begun = performance.now();
    await third.stop();
    expect(performance.now() - begun).toBeLessThan(STOP_MS);
    expect((await line.closed).code).toBe(1001);
    await end;
  });
  /** Far below what a process gets to stop (15 s), far above what it takes. */
  const STOP_MS = 10_000;

  it('is not kept open at a path that is none for sockets', async () => {
    const open = () =>
      new Promise<number>((resolve) => lab.service.app.server.getConnections((_, count) => resolve(count)));
    const before = await open();
    for (const path of ['/healthz', '/graphiql', '/nowhere', '/v1/me']) {
      const socket = new WebSocket(`${lab.service.url.replace('http', 'ws')}${path}`);
      socket.on('error', () => {});
      await new Promise((resolve) => socket.on('close', resolve));
    }
    await expect.poll(open).toBeLessThanOrEqual(before);
  });

  it('leaves no listener behind when its client vanishes', async () => {
    const id = await requestDesign(lab.service, another());
    const socket = new WebSocket(`${lab.service.url.replace('http', 'ws')}/graphql`, 'graphql-transport-ws');
    const listeners = countListeners(lab.service.store.notifications);
    await new Promise((resolve) => socket.on('open', resolve));
    const before = listeners();
    socket.send(JSON.stringify({ type: 'connection_init', payload: { authorization: `Bearer ${token()}` } }));
    const told = new Promise<void>((resolve) => {
      socket.on('message', (data) => {
        const { type } = JSON.parse(String(data));
        if (type === 'connection_ack')
          socket.send(
            JSON.stringify({ id: '1', type: 'subscribe', payload: { query: WATCH, variables: { id } } }),
          );
        if (type === 'next') resolve();
      });
    });
    await told;
    expect(listeners()).toBe(before + 1);
    socket.terminate();
    await expect.poll(listeners).toBe(before);
  });
});
