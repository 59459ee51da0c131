import { connect } from 'node:net';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { type Service, startService } from './service.ts';

let service: Service;
const log: string[] = [];

beforeAll(async () => {
  service = await startService({ logLine: (line) => log.push(line) });
});
afterAll(() => service?.stop());

/** Bytes as they are, because fetch would mend them. */
function raw(text: string): Promise<string> {
  const { port } = new URL(service.url);
  return new Promise((resolve, reject) => {
    const socket = connect(Number(port), '127.0.0.1', () => socket.end(text));
    let answer = '';
    socket.on('data', (chunk) => {
      answer += chunk;
    });
    socket.on('end', () => resolve(answer));
    socket.on('error', reject);
  });
}

describe('paths and methods', () => {
  it('is 404 where nothing is, as a problem', async () => {
    const answer = await service.call('/v1/nothing', { token: null });
    expect([answer.status, answer.json.code]).toEqual([404, 'NOT_FOUND']);
    expect(answer.headers.get('content-type')).toBe('application/problem+json');
  });

  // RFC 9110 section 15.5.6: a 405 must carry Allow.
  it('[published] is 405 with Allow where a path does not take the method', async () => {
    const cases = [
      ['DELETE', '/v1/chips/NONE-1', 'GET, HEAD, PUT'],
      ['POST', '/v1/me', 'GET, HEAD'],
      ['GET', '/v1/specification-checks', 'POST'],
      ['PATCH', '/v1/chips/NONE-1/releases/current.csv', 'GET, HEAD, PUT'],
      ['OPTIONS', '/v1/design-requests', 'GET, HEAD, POST'],
    ] as const;
    for (const [method, path, allow] of cases) {
      const answer = await service.call(path, { method });
      expect([path, answer.status, answer.headers.get('allow')]).toEqual([path, 405, allow]);
      expect(answer.json.code).toBe('METHOD_NOT_ALLOWED');
    }
  });

  it('is 406 for a representation that is not on offer, and lists those that are', async () => {
    await service.registerChip('HTTP-1');
    const answer = await service.call('/v1/chips/HTTP-1/releases/current', {
      headers: { accept: 'image/png' },
    });
    expect([answer.status, answer.json.code]).toEqual([406, 'NOT_ACCEPTABLE']);
    expect(answer.json.allowed).toEqual([
      { mediaType: 'application/json', suffix: '.json' },
      { mediaType: 'text/csv', suffix: '.csv' },
    ]);
  });
});

describe('headers', () => {
  it('says of every API answer that it depends on the token and must be revalidated', async () => {
    for (const answer of [await service.call('/v1/me'), await service.call('/v1/me', { token: null })]) {
      expect(answer.headers.get('vary')).toBe('Accept, Authorization');
      expect(answer.headers.get('cache-control')).toBe('private, no-cache');
    }
  });

  it('lets nothing run, load, frame or read across origins', async () => {
    const answer = await service.call('/v1/me', { headers: { origin: 'https://elsewhere.example' } });
    expect(answer.headers.get('content-security-policy')).toBe("default-src 'none'; frame-ancestors 'none'");
    expect(answer.headers.get('x-content-type-options')).toBe('nosniff');
    expect(answer.headers.get('referrer-policy')).toBe('no-referrer');
    expect(answer.headers.get('access-control-allow-origin')).toBe(null);
    expect(answer.headers.get('x-powered-by')).toBe(null);
  });

  it('keeps a request id that is safe to log, and makes one otherwise', async () => {
    const kept = await service.call('/v1/me', { headers: { 'x-request-id': 'bench-7.42' } });
    expect(kept.headers.get('x-request-id')).toBe('bench-7.42');
    const made = await service.call('/v1/me', { headers: { 'x-request-id': 'a b"c' } });
    expect(made.headers.get('x-request-id')).toMatch(/^[A-Za-z0-9.]+$/);
    const next = await service.call('/v1/me');
    expect(next.headers.get('x-request-id')).not.toBe(made.headers.get('x-request-id'));
  });

  // RFC 9110 section 15.4.5.
  it('[published] repeats ETag, Vary and Cache-Control in a 304 and sends no content', async () => {
    const first = await service.call('/v1/service');
    const again = await service.call('/v1/service', {
      headers: { 'if-none-match': first.headers.get('etag')! },
    });
    expect([again.status, again.text]).toEqual([304, '']);
    for (const name of ['etag', 'vary', 'cache-control'])
      expect(again.headers.get(name)).toBe(first.headers.get(name));
  });
});

describe('bytes that are no request', () => {
  it('are refused with a problem and a closed connection', async () => {
    const answer = await raw('NONSENSE\r\n\r\n');
    expect(answer).toMatch(/^HTTP\/1\.1 400 /);
    expect(answer).toMatch(/content-type: application\/problem\+json/i);
    expect(JSON.parse(answer.split('\r\n\r\n')[1]!)).toMatchObject({ code: 'BAD_INPUT', status: 400 });
  });

  it('are refused when the body is shorter than announced', async () => {
    const answer = await raw(
      `POST /v1/specification-checks HTTP/1.1\r\nHost: x\r\nAuthorization: Bearer ${service.tokens.READER}\r\nContent-Type: application/json\r\nContent-Length: 100\r\n\r\n{}`,
    );
    expect(answer === '' || /^HTTP\/1\.1 400 /.test(answer)).toBe(true);
  });
});

describe('the log', () => {
  it('has one line a request, with actor and route and without token or query', async () => {
    log.length = 0;
    await service.call('/v1/chips?first=7', { headers: { 'x-request-id': 'log-test-1' } });
    await new Promise((resolve) => setTimeout(resolve, 20));
    const line = log.map((text) => JSON.parse(text)).find((entry) => entry.reqId === 'log-test-1');
    expect(line).toMatchObject({ method: 'GET', path: '/v1/chips', status: 200, actor: 'invented designer' });
    expect(log.join('')).not.toContain(service.tokens.DESIGNER.slice(17));
  });
});
