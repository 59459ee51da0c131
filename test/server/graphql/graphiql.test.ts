import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { type Service, startService } from '../rest/service.ts';

let service: Service;
beforeAll(async () => {
  service = await startService();
});
afterAll(() => service?.stop());

const get = (path: string) => service.call(path, { token: null });

describe('the page to try queries on', () => {
  it('and everything it loads comes from this service', async () => {
    const { status, headers, text } = await get('/graphiql');
    expect([status, headers.get('content-type')]).toEqual([200, 'text/html; charset=utf-8']);
    const links = [...text.matchAll(/(?:src|href)="([^"]+)"/g)].map((match) => match[1]!);
    const local = links.filter((link) => link !== 'data:,');
    expect(local.length).toBeGreaterThanOrEqual(7);
    for (const link of local) {
      const asset = await get(link);
      const type = link.endsWith('.css') ? 'text/css' : 'text/javascript';
      expect([link, asset.status, asset.headers.get('content-type')]).toEqual([
        link,
        200,
        `${type}; charset=utf-8`,
      ]);
    }
  });

  it('may load nothing from elsewhere and run nothing that stands in the page', async () => {
    const { headers, text } = await get('/graphiql');
    const policy = headers.get('content-security-policy') ?? '';
    expect(policy).toContain("default-src 'none'");
    expect(policy).toContain("script-src 'self';");
    expect(policy).toContain("frame-ancestors 'none'");
    expect(policy).not.toMatch(/https?:|unsafe-eval|\*/);
    expect(text).not.toMatch(/<script(?![^>]*\bsrc=)|\bon\w+="|https?:\/\//);
  });

  it('holds examples that the schema takes [cross-check]', async () => {
    const { text } = await get('/graphiql/page.js');
    const examples = [...text.matchAll(/`(#[^`]+)`/g)].map((match) => match[1]!);
    expect(examples.length).toBeGreaterThanOrEqual(5);
    for (const query of examples) {
      const { json, status } = await service.call('/graphql', {
        method: 'POST',
        body: { query, variables: { chip: 'NONE', id: 'req_none' } },
      });
      // Taken: what is missing is the chip, or the socket that a subscription needs.
      const codes = (json.errors ?? []).map((error: { message: string; extensions: { code: string } }) =>
        /WebSocket/.test(error.message) ? 'SUBSCRIPTION' : error.extensions.code,
      );
      expect([
        query.slice(0, 40),
        codes.every((code: string) => ['NOT_FOUND', 'SUBSCRIPTION'].includes(code)),
        status < 500,
      ]).toEqual([query.slice(0, 40), true, true]);
    }
  });
});
