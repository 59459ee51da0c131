import { getIntrospectionQuery } from 'graphql';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { type Service, startService } from '../rest/service.ts';
import { ask, askTwice } from './ask.ts';
import { REQUEST, registerChip, SERIAL, SPECIFICATION } from './lab.ts';
import { startSecond } from './second.ts';

let service: Service;
const log: string[] = [];
let databaseUrl = '';
beforeAll(async () => {
  service = await startService({
    logLine: (line) => log.push(line),
    databaseUrl: async (url) => {
      databaseUrl = url;
      return url;
    },
  });
  await registerChip(service, SERIAL);
});
afterAll(() => service?.stop());

const CHECK =
  'query ($input: RequestDesignInput!) { checkSpecification(input: $input) { ok problem { code pointer } } }';
const request = (band: string) => `mutation { requestDesign(input: {chip: "${SERIAL}", specification: {family:
  {family: BUTTERWORTH, shape: LOW_PASS, order: 2, band: ${band}}}}) { request { id } } }`;

/** What both the plain and the compiled run answer. */
async function refusal(query: string, variables?: Record<string, unknown>) {
  const [first, second] = await askTwice(service, query, variables ? { variables } : {});
  expect({ ...second, headers: null }).toEqual({ ...first, headers: null });
  const { code, pointer, given, detail } = first.errors[0]!.extensions;
  return { status: first.status, data: first.data, code, pointer, given, detail };
}

describe('values that graphql would let pass', () => {
  it('1e400, which its Float reads as Infinity, is refused with its place', async () => {
    const query = request('{offsetGhz: {low: -5, high: 1e400}}');
    expect(await refusal(query)).toMatchObject({
      data: { requestDesign: null },
      code: 'BAD_INPUT',
      pointer: '/specification/family/band/offsetGhz/high',
      given: 'Infinity',
    });
  });

  it('a variable that is null as the one member of a one-of', async () => {
    const query = `query ($x: RangeInput) { checkSpecification(input: {chip: "${SERIAL}", specification: {family: {family: BUTTERWORTH, shape: LOW_PASS, order: 2, band: {offsetGhz: $x}}}}) { ok } }`;
    for (const x of [null, undefined]) {
      const { code, pointer, data } = await refusal(query, { x });
      expect([code, pointer, data]).toEqual(['BAD_INPUT', '/specification/family/band/offsetGhz', null]);
    }
    const whole = {
      chip: SERIAL,
      specification: { family: { ...SPECIFICATION.family, band: { offsetGhz: null } } },
    };
    expect(await refusal(CHECK, { input: whole })).toMatchObject({
      code: 'BAD_INPUT',
      pointer: '/specification/family/band/offsetGhz',
    });
  });

  it('NUL and lone surrogates in texts', async () => {
    for (const label of ['a\\u0000b', 'a\\ud800b']) {
      const query = `{ checkSpecification(input: {chip: "${SERIAL}", specification: {mask: {bands: [{interval: {offsetGhz: {low: -1, high: 1}}, minTransmissionDb: -1, label: "${label}"}]}}}) { ok problem { code } } }`;
      const { status, errors, data } = await ask(service, query);
      expect([
        label,
        status < 500,
        errors[0]?.extensions.code ?? data.checkSpecification.problem.code,
      ]).toEqual([label, true, 'BAD_INPUT']);
    }
  });

  it('a cursor, a key and a name with what they may not have', async () => {
    expect(await refusal('{ chips(after: "\\u0000") { edges { cursor } } }')).toMatchObject({
      status: 400,
      code: 'BAD_CURSOR',
    });
    expect(await refusal('{ designs(filter: {chip: "a b"}) { edges { cursor } } }')).toMatchObject({
      code: 'BAD_INPUT',
    });
  });
});

describe('values that do not fit their type', () => {
  it('are named by pointers into the input', async () => {
    const wrong = (family: object) => ({
      input: { chip: SERIAL, specification: { family: { ...SPECIFICATION.family, ...family } } },
    });
    expect(await refusal(CHECK, wrong({ order: 2.5 }))).toMatchObject({
      status: 200,
      code: 'BAD_INPUT',
      pointer: '/specification/family/order',
      given: 2.5,
    });
    expect(await refusal(CHECK, wrong({ shape: 'ROUND' }))).toMatchObject({
      code: 'BAD_INPUT',
      pointer: '/specification/family/shape',
      given: 'ROUND',
    });
    expect(await refusal(CHECK, wrong({ colour: 1 }))).toMatchObject({
      code: 'BAD_INPUT',
      pointer: '/specification/family',
    });
    expect(await refusal(CHECK, { input: null })).toMatchObject({ code: 'BAD_INPUT', pointer: '' });
    expect(
      await refusal('query ($n: Int) { chips(first: $n) { edges { cursor } } }', { n: 'ten' }),
    ).toMatchObject({ code: 'BAD_INPUT', pointer: '/first', given: 'ten' });
  });

  it('written in the document have their place too', async () => {
    expect(await refusal(request('{offsetGhz: {low: "x", high: 5}}'))).toMatchObject({
      code: 'BAD_INPUT',
      pointer: '/specification/family/band/offsetGhz/low',
    });
    expect(
      await refusal(request('{offsetGhz: {low: 0, high: 5}, offsetFsr: {low: 0, high: 1}}')),
    ).toMatchObject({ code: 'BAD_INPUT', pointer: '/specification/family/band' });
  });

  it('are all told when there are several', async () => {
    const input = {
      chip: SERIAL,
      specification: { family: { ...SPECIFICATION.family, order: 'a', rippleDb: 'b' } },
    };
    const { errors } = await ask(service, CHECK, { variables: { input } });
    expect(errors[0]?.extensions.errors.map(({ pointer }) => pointer)).toEqual([
      '/specification/family/order',
      '/specification/family/rippleDb',
    ]);
  });
});

describe('requests of the core that cannot be met', () => {
  it('are refused with the same problem as by REST [cross-check]', async () => {
    const family = { family: 'BUTTERWORTH', shape: 'LOW_PASS', order: 2 };
    const bands = [
      { frequencyThz: { low: 1552, high: 1553 } },
      { offsetGhz: { low: 5, high: -5 } },
      { offsetGhz: { low: -40, high: 40 } },
    ];
    for (const specification of [
      ...bands.map((band) => ({ family: { ...family, band } })),
      { family: { ...SPECIFICATION.family, rippleDb: -1 } },
    ]) {
      const input = { chip: SERIAL, specification };
      const { errors } = await ask(service, REQUEST, { variables: { input } });
      const { json } = await service.call('/v1/design-requests', { method: 'POST', body: input });
      expect(errors[0]?.extensions).toEqual(json);
    }
  });

  it('ask for a chip that is not there', async () => {
    const input = { chip: 'NOT-HERE', specification: SPECIFICATION };
    const { errors, status, data } = await ask(service, REQUEST, { variables: { input } });
    expect([status, data]).toEqual([200, { requestDesign: null }]);
    expect(errors[0]?.extensions).toMatchObject({
      code: 'NOT_FOUND',
      status: 404,
      pointer: '/chip',
      given: 'NOT-HERE',
    });
  });
});

describe('tokens', () => {
  it('that are missing, malformed, unknown, expired or revoked get 401 and are told why', async () => {
    const soon = await service.newToken('READER', new Date(Date.now() + 300));
    const revoked = await service.newToken('READER');
    await service.revoke(revoked.id);
    await new Promise((resolve) => setTimeout(resolve, 400));
    const faults: [string | null, RegExp][] = [
      [null, /carries no token/],
      ['nonsense', /malformed/],
      [`rbt_${'a'.repeat(12)}_${'A'.repeat(43)}`, /never issued/],
      [soon.token, /expired/],
      [revoked.token, /revoked/],
    ];
    for (const [token, detail] of faults) {
      const { status, headers, data, errors } = await ask(service, '{ me { role } }', { token });
      expect([status, data, errors[0]?.extensions.code]).toEqual([401, null, 'UNAUTHENTICATED']);
      expect(errors[0]?.message).toMatch(detail);
      expect(headers.get('www-authenticate')).toMatch(/^Bearer realm="ringbinder"/);
    }
  });

  it('are needed for introspection', async () => {
    expect((await ask(service, getIntrospectionQuery(), { token: null })).status).toBe(401);
    for (const token of Object.values(service.tokens)) {
      const { status, data } = await ask(service, getIntrospectionQuery(), { token });
      expect([status, data.__schema.queryType.name]).toEqual([200, 'Query']);
    }
  });
});

describe('a schema that is open by configuration', () => {
  it('may be asked about without a token, nothing else may', async () => {
    const open = await startSecond(databaseUrl, { openIntrospection: true });
    const post = async (query: string, headers = {}) => {
      const body = JSON.stringify({ query });
      const init = { method: 'POST', headers: { 'content-type': 'application/json', ...headers }, body };
      const answer = await fetch(`${open.url}/graphql`, init);
      const { data = null, errors } = (await answer.json()) as { data?: unknown; errors?: unknown };
      return { status: answer.status, data, errors };
    };
    const introspection = await post(getIntrospectionQuery());
    expect([introspection.status, introspection.errors]).toEqual([200, undefined]);
    expect(await post('{ __typename }')).toMatchObject({ status: 200, data: { __typename: 'Query' } });
    for (const query of [
      '{ me { role } }',
      '{ __typename me { role } }',
      '{ ...F } fragment F on Query { service { version } }',
    ]) {
      const { status, data } = await post(query);
      expect([query, status, data]).toEqual([query, 401, null]);
    }
    expect((await post('{ __typename }', { authorization: 'Bearer nonsense' })).status).toBe(401);
    await open.stop();
  });
});

describe('documents', () => {
  it('with several operations run the one that is named, compiled or not', async () => {
    const query =
      'query A { me { role } } mutation B { revokeToken(input: {id: "tok_none"}) { token { id } } } query C { service { engineVersion } ...F } fragment F on Query { me { role } }';
    for (let time = 0; time < 4; time++) {
      expect((await ask(service, query, { operationName: 'A' })).data).toEqual({ me: { role: 'DESIGNER' } });
      expect((await ask(service, query, { operationName: 'C' })).data).toMatchObject({ service: {}, me: {} });
      expect((await ask(service, query, { operationName: 'B' })).data).toEqual({ revokeToken: null });
    }
    expect((await ask(service, query)).errors[0]?.extensions).toMatchObject({
      code: 'BAD_INPUT',
      allowed: ['A', 'B', 'C'],
    });
    expect((await ask(service, query, { operationName: 'D' })).errors[0]?.extensions.code).toBe('BAD_INPUT');
    const url = `/graphql?query=${encodeURIComponent(query)}&operationName=B`;
    const byGet = await service.call(url);
    expect([byGet.status, byGet.headers.get('allow'), byGet.json.errors[0].extensions.code]).toEqual([
      405,
      'POST',
      'METHOD_NOT_ALLOWED',
    ]);
    expect((await service.call(url.replace(/B$/, 'A'))).json.data).toEqual({ me: { role: 'DESIGNER' } });
  });

  it('that are no GraphQL, or a subscription over HTTP, are refused', async () => {
    for (const query of [
      '{ me { ',
      '',
      '{"kind":"Document","definitions":[]}',
      '{ nothing }',
      'fragment F on Chip { id }',
    ]) {
      const { errors, data } = await ask(service, query);
      expect([query, data, errors[0]?.extensions.code]).toEqual([query, null, 'BAD_INPUT']);
    }
    const { status, errors } = await ask(service, 'subscription { releasePublished(chip: "x") { id } }');
    expect([status, errors[0]?.extensions.code]).toEqual([400, 'BAD_INPUT']);
    expect(errors[0]?.message).toMatch(/WebSocket/);
  });

  it('come as JSON in UTF-8, and what is none is refused', async () => {
    for (const body of ['{', '{"query": 1e400}', '{"query":"{ me { role } }","query":"x"}']) {
      const { status, json } = await service.call('/graphql', { method: 'POST', body });
      expect([body, status, json.errors[0].extensions.code]).toEqual([body, 400, 'BAD_INPUT']);
    }
    const text = await service.call('/graphql', {
      method: 'POST',
      body: '{ me { role } }',
      headers: { 'content-type': 'application/graphql' },
    });
    expect([text.status, text.json.errors[0].extensions.code]).toEqual([415, 'UNSUPPORTED_MEDIA_TYPE']);
    const picky = await service.call('/graphql', {
      method: 'POST',
      body: { query: '{ me { role } }' },
      headers: { accept: 'text/html' },
    });
    expect([picky.status, picky.json.errors[0].extensions.code]).toEqual([406, 'NOT_ACCEPTABLE']);
  });
});

describe('a defect', () => {
  it('tells an id and nothing else; the log has the rest', async () => {
    await service.store.pool.query('alter table history rename to history_hidden');
    try {
      const { status, data, errors } = await ask(service, '{ history { edges { cursor } } }');
      expect([status, data]).toEqual([500, null]);
      const { code, instance, detail } = errors[0]!.extensions;
      expect(code).toBe('INTERNAL');
      expect(JSON.stringify(errors)).not.toMatch(/history_hidden|relation|select|stack|\.ts/i);
      expect(detail).toContain(instance!.replace('urn:uuid:', ''));
      const line = log.find((one) => one.includes(instance!));
      expect(line).toMatch(/relation \\"history\\" does not exist/);
    } finally {
      await service.store.pool.query('alter table history_hidden rename to history');
    }
  });
});
