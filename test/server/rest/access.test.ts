import Fastify from 'fastify';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';

import { generateToken } from '../../../server/auth/index.ts';
import { registerAccess } from '../../../server/rest/index.ts';
import { ROLES, type Service, startService } from './service.ts';

/**
 * Who may what, written down apart from the table in the code: section "Who may what" of the service's contract.
 * E: every role. P: READER, DESIGNER, ADMIN. M: DESIGNER, ADMIN. `-`: no token asked. O: this machine or ADMIN.
 */
const RULES: Readonly<Record<string, 'E' | 'P' | 'M' | '-' | 'O'>> = {
  'GET /v1/me': 'E',
  'GET /v1/service': 'E',
  'GET /v1/chips': 'E',
  'GET /v1/chips/:serial': 'E',
  'PUT /v1/chips/:serial': 'M',
  'GET /v1/chips/:serial/revisions': 'E',
  'GET /v1/chips/:serial/revisions/:number': 'E',
  'POST /v1/specification-checks': 'P',
  'POST /v1/design-requests': 'M',
  'GET /v1/design-requests': 'P',
  'GET /v1/design-requests/:id': 'P',
  'POST /v1/design-requests/:id/cancel': 'M',
  'GET /v1/designs': 'P',
  'GET /v1/designs/:id': 'E',
  'GET /v1/designs/:id/setting': 'E',
  'GET /v1/designs/:id/setting.json': 'E',
  'GET /v1/designs/:id/setting.csv': 'E',
  'GET /v1/designs/:id/netlist.json': 'E',
  'GET /v1/designs/:id/response': 'E',
  'GET /v1/designs/:id/response.json': 'E',
  'GET /v1/designs/:id/response.csv': 'E',
  'GET /v1/designs/:id/response.s2p': 'E',
  'GET /v1/designs/:id/plots/transmission.svg': 'E',
  'GET /v1/designs/:id/plots/group-delay.svg': 'E',
  'GET /v1/designs/:id/plots/pole-zero.svg': 'E',
  'GET /v1/chips/:serial/configurations': 'E',
  'GET /v1/chips/:serial/configurations/:name': 'E',
  'GET /v1/chips/:serial/configurations/:name/versions': 'E',
  'POST /v1/chips/:serial/configurations/:name/versions': 'M',
  'GET /v1/chips/:serial/configurations/:name/versions/:number': 'E',
  'GET /v1/chips/:serial/releases': 'E',
  'GET /v1/chips/:serial/releases/:name': 'E',
  'GET /v1/chips/:serial/releases/:name/log': 'E',
  'PUT /v1/chips/:serial/releases/:name': 'M',
  'GET /v1/history': 'P',
  'GET /openapi.json': '-',
  'GET /problems/:type': '-',
  'GET /healthz': '-',
  'GET /readyz': '-',
  'GET /metrics': 'O',
};

const MAY = {
  E: ['READER', 'DESIGNER', 'INSTRUMENT', 'ADMIN'],
  P: ['READER', 'DESIGNER', 'ADMIN'],
  M: ['DESIGNER', 'ADMIN'],
} as const;

/** Paths that stand for a pattern; nothing there exists, which is 404 for whoever may look. */
const pathOf = (pattern: string): string =>
  pattern
    .replace(':type', 'bad-input')
    .replace(':serial', 'NONE-1')
    .replace(':id', 'req_00000000000000000000000000')
    .replace(':name', 'none')
    .replace(':number', '1');

/** A notice of the database takes milliseconds; a busy machine gets a second. */
const NOTICE_MS = 1000;

let service: Service;
const seen: { method: string; url: string }[] = [];

beforeAll(async () => {
  service = await startService();
  const { paths } = service.app.swagger() as { paths: Record<string, Record<string, unknown>> };
  for (const [path, methods] of Object.entries(paths)) {
    const url = path.replace(/\{(\w+)\}/g, ':$1');
    for (const method of Object.keys(methods)) seen.push({ method: method.toUpperCase(), url });
  }
});
afterAll(() => service?.stop());

describe('every route with every role', () => {
  it('has a rule here for every route there is, and no other', () => {
    const rest = seen.filter(({ url }) => !/^\/(graphql|graphiql)/.test(url));
    expect(rest.map(({ method, url }) => `${method} ${url}`).sort()).toEqual(Object.keys(RULES).sort());
  });

  it.each(Object.entries(RULES))('%s', async (route, rule) => {
    const [method, pattern] = route.split(' ') as [string, string];
    const ask = (token: string | null) =>
      service.call(pathOf(pattern), { method, token, ...(method === 'GET' ? {} : { body: {} }) });
    const nobody = await ask(null);
    if (rule === '-' || rule === 'O') {
      expect(nobody.status).toBe(200);
      return;
    }
    expect([nobody.status, nobody.json.code]).toEqual([401, 'UNAUTHENTICATED']);
    expect(nobody.headers.get('www-authenticate')).toMatch(/^Bearer/);
    for (const role of ROLES) {
      const answer = await ask(service.tokens[role]);
      const allowed = (MAY[rule] as readonly string[]).includes(role);
      if (allowed) expect([200, 400, 404, 428], `${role}: ${answer.text}`).toContain(answer.status);
      else {
        expect([role, answer.status, answer.json?.code]).toEqual([role, 403, 'FORBIDDEN']);
        expect([...answer.json.allowed].sort()).toEqual([...MAY[rule]].sort());
      }
    }
  });

  it('answers HEAD wherever GET is answered, by the same rule', async () => {
    for (const [route, rule] of Object.entries(RULES)) {
      const [method, pattern] = route.split(' ') as [string, string];
      if (method !== 'GET') continue;
      const token = rule === '-' ? null : service.tokens.ADMIN;
      const [get, head] = await Promise.all(
        ['GET', 'HEAD'].map((verb) => service.call(pathOf(pattern), { method: verb, token })),
      );
      expect([route, head!.status, head!.text]).toEqual([route, get!.status, '']);
      expect(head!.headers.get('content-type')).toBe(get!.headers.get('content-type'));
    }
  });

  it('refuses to start when a route has no rule', async () => {
    const app = Fastify();
    registerAccess(app, () => Promise.reject(new Error('nobody is asked')));
    app.get('/remembered', { config: { access: 'chip.read' } }, async () => 'for readers');
    app.get('/forgotten', async () => 'open to everybody');
    await expect(app.ready()).rejects.toThrow('No access rule for GET /forgotten, HEAD /forgotten.');
  });
});

describe('tokens', () => {
  const me = (headers: Record<string, string>) => service.call('/v1/me', { token: null, headers });

  it('tells who asks', async () => {
    const answer = await service.call('/v1/me', { token: service.tokens.INSTRUMENT });
    expect(answer.json).toMatchObject({
      role: 'INSTRUMENT',
      actor: { kind: 'INSTRUMENT', name: 'invented instrument' },
    });
  });

  it.each([
    ['missing', {}, /carries no token/],
    ['of another scheme', { authorization: 'Basic YTpi' }, /malformed/],
    ['malformed', { authorization: 'Bearer rbt_short' }, /malformed/],
    ['unknown', { authorization: `Bearer ${generateToken().token}` }, /never issued/],
  ])('is 401 when %s, and says so', async (_, headers, detail) => {
    const answer = await me(headers as Record<string, string>);
    expect([answer.status, answer.json.code]).toEqual([401, 'UNAUTHENTICATED']);
    expect(answer.json.detail).toMatch(detail);
    expect(answer.headers.get('www-authenticate')).toMatch(/^Bearer/);
  });

  it('is 401 with a right look-up part and a wrong secret', async () => {
    const wrong = service.tokens.ADMIN.slice(0, 17) + 'A'.repeat(43);
    expect((await me({ authorization: `Bearer ${wrong}` })).status).toBe(401);
  });

  it('is 401 once it has expired', async () => {
    const { token } = await service.newToken('READER', new Date(Date.now() + 1500));
    expect((await service.call('/v1/me', { token })).status).toBe(200);
    await new Promise((resolve) => setTimeout(resolve, 1600));
    const answer = await service.call('/v1/me', { token });
    expect(answer.status).toBe(401);
    expect(answer.json.detail).toMatch(/expired/);
  });

  it('is 401 within a second of its revocation, although it was remembered', async () => {
    const { token, id } = await service.newToken('READER');
    expect((await service.call('/v1/me', { token })).status).toBe(200);
    await service.revoke(id);
    const end = performance.now() + NOTICE_MS;
    let answer = await service.call('/v1/me', { token });
    while (answer.status === 200 && performance.now() < end) answer = await service.call('/v1/me', { token });
    expect(answer.status).toBe(401);
    expect(answer.json.detail).toMatch(/revoked/);
  });
});

describe('rate', () => {
  it('grants a burst of twice the rate, then 429 with the seconds to wait, each token by itself', async () => {
    const slow = await startService({ ratePerS: 5 });
    try {
      const ask = (token: string) => slow.call('/v1/me', { token });
      const statuses: number[] = [];
      for (let i = 0; i < 12; i++) statuses.push((await ask(slow.tokens.READER)).status);
      expect(statuses.slice(0, 10)).toEqual(Array(10).fill(200));
      const refused = await ask(slow.tokens.READER);
      expect([refused.status, refused.json.code]).toEqual([429, 'RATE_LIMITED']);
      expect(refused.headers.get('retry-after')).toBe('1');
      expect((await ask(slow.tokens.DESIGNER)).status).toBe(200);
      await new Promise((resolve) => setTimeout(resolve, 1000));
      expect((await ask(slow.tokens.READER)).status).toBe(200);
    } finally {
      await slow.stop();
    }
  });
});

describe('metrics', () => {
  it('are for this machine, or for an administrator when the request came through a proxy', async () => {
    const forwarded = { 'x-forwarded-for': '192.0.2.7' };
    expect((await service.call('/metrics', { token: null })).text).toMatch(/ringbinder_http_requests_total/);
    expect((await service.call('/metrics', { token: null, headers: forwarded })).status).toBe(401);
    expect(
      (await service.call('/metrics', { token: service.tokens.READER, headers: forwarded })).status,
    ).toBe(403);
    expect((await service.call('/metrics', { token: service.tokens.ADMIN, headers: forwarded })).status).toBe(
      200,
    );
  });
});
