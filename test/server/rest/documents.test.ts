import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { PROBLEM_CODES } from '../../../schema/problem.ts';
import { type Service, startService } from './service.ts';

let service: Service;
// biome-ignore lint/suspicious/noExplicitAny: a foreign document, checked member by member
let document: any;

beforeAll(async () => {
  service = await startService();
  document = (await service.call('/openapi.json', { token: null })).json;
});
afterAll(() => service?.stop());

const METHODS = ['get', 'put', 'post', 'delete', 'patch', 'head', 'options'];

/** Every value under a key, anywhere. */
function* allOf(node: unknown, key: string): Generator<unknown> {
  if (typeof node !== 'object' || node === null) return;
  for (const [name, value] of Object.entries(node)) {
    if (name === key) yield value;
    yield* allOf(value, key);
  }
}

const operations = () =>
  Object.entries(document.paths as Record<string, Record<string, unknown>>).flatMap(([path, item]) =>
    Object.entries(item)
      .filter(([method]) => METHODS.includes(method))
      // biome-ignore lint/suspicious/noExplicitAny: as above
      .map(([method, operation]) => ({ path, method, operation: operation as any })),
  );

// Required members: OpenAPI Specification 3.1.0 sections 4.8.1, 4.8.2, 4.8.9, 4.8.10, 4.8.12, 4.8.16, from memory.
describe('OpenAPI document', () => {
  it('[published] has the members that OpenAPI 3.1 requires', () => {
    expect(document.openapi).toMatch(/^3\.1\.\d+$/);
    expect(document.info).toMatchObject({ title: 'Ringbinder', version: '0.0.0-test' });
    expect(operations().length).toBeGreaterThan(30);
    for (const { path, method, operation } of operations()) {
      const place = `${method} ${path}`;
      expect(path.startsWith('/'), place).toBe(true);
      expect(operation.summary, place).toBeTypeOf('string');
      expect(Object.keys(operation.responses).length, place).toBeGreaterThan(0);
      for (const [status, response] of Object.entries<{ description: string }>(operation.responses)) {
        expect(status, place).toMatch(/^[1-5]\d\d$/);
        expect(response.description, `${place} ${status}`).toBeTypeOf('string');
      }
      const inPath = [...path.matchAll(/\{(\w+)\}/g)].map((found) => found[1]);
      const parameters: { in: string; name: string; required?: boolean; schema: object }[] =
        operation.parameters ?? [];
      const described = parameters.filter((parameter) => parameter.in === 'path');
      expect(described.map(({ name }) => name).sort(), place).toEqual([...inPath].sort());
      for (const parameter of described) expect(parameter.required, place).toBe(true);
      const names = parameters.map((parameter) => `${parameter.in} ${parameter.name}`);
      expect(new Set(names).size, place).toBe(names.length);
    }
  });

  it('refers only to what it holds', () => {
    const references = [...allOf(document, '$ref')] as string[];
    expect(references.length).toBeGreaterThan(0);
    for (const reference of references) {
      expect(reference).toMatch(/^#\//);
      const target = reference
        .slice(2)
        .split('/')
        // biome-ignore lint/suspicious/noExplicitAny: as above
        .reduce<any>((node, part) => node?.[part], document);
      expect(target, reference).toBeDefined();
    }
    for (const name of Object.keys(document.components.schemas)) {
      expect(references).toContain(`#/components/schemas/${name}`);
    }
  });

  it('describes the problems of every route with their codes', () => {
    for (const { path, method, operation } of operations()) {
      const place = `${method} ${path}`;
      const statuses = Object.keys(operation.responses);
      expect(statuses, place).toEqual(expect.arrayContaining(['400', '500', '503']));
      if (path.startsWith('/v1/')) {
        expect(statuses, place).toEqual(expect.arrayContaining(['401', '403', '429']));
        expect(operation.security, place).toEqual([{ bearer: [] }]);
      }
      for (const [status, response] of Object.entries<{ content?: object; description: string }>(
        operation.responses,
      )) {
        if (Number(status) < 400) continue;
        expect(Object.keys(response.content ?? {}), `${place} ${status}`).toEqual([
          'application/problem+json',
        ]);
        const codes = [...response.description.matchAll(/\b([A-Z][A-Z_]+):/g)].map((found) => found[1]);
        expect(codes.length, `${place} ${status}`).toBeGreaterThan(0);
        for (const code of codes) expect(PROBLEM_CODES).toContain(code);
      }
    }
  });

  it('takes the limits of bodies from the rules that check them', () => {
    const schema = document.paths['/v1/design-requests'].post.requestBody.content['application/json'].schema;
    expect(schema).toMatchObject({ type: 'object', additionalProperties: false });
    expect(schema.required).toEqual(['chip', 'specification']);
    expect(JSON.stringify(schema)).toContain('"CHEBYSHEV_II"');
  });
});

describe('pages', () => {
  it('reads the document at /docs with assets of its own and a policy that allows no others', async () => {
    const page = await service.call('/docs', { token: null });
    expect([page.status, page.headers.get('content-type')]).toEqual([200, 'text/html; charset=utf-8']);
    const policy = page.headers.get('content-security-policy')!;
    expect(policy).toMatch(/default-src 'none'/);
    expect(policy).not.toMatch(/https?:|upgrade-insecure-requests|unsafe-eval|\*/);
    const assets = [...page.text.matchAll(/(?:src|href)="([^"]+)"/g)].map((found) => found[1]!);
    expect(assets.length).toBeGreaterThan(3);
    for (const asset of assets) {
      expect(asset).not.toMatch(/^(https?:)?\/\//);
      const address = new URL(asset, `${service.url}/docs/`);
      expect([asset, (await fetch(address)).status]).toEqual([asset, 200]);
    }
    expect(page.text).not.toMatch(/https?:\/\/(?!www\.w3\.org)/);
  });

  it('explains every kind of problem at its type, in Markdown or HTML', async () => {
    for (const code of PROBLEM_CODES) {
      const path = `/problems/${code.toLowerCase().replaceAll('_', '-')}`;
      const page = await service.call(path, { token: null });
      expect([path, page.status, page.headers.get('content-type')]).toEqual([
        path,
        200,
        'text/markdown; charset=utf-8',
      ]);
      expect(page.text).toContain(`\`${code}\``);
      const html = await service.call(path, { token: null, headers: { accept: 'text/html' } });
      expect(html.headers.get('content-type')).toBe('text/html; charset=utf-8');
      expect(html.text).toContain(`<code>${code}</code>`);
    }
    expect((await service.call('/problems/no-such-thing', { token: null })).status).toBe(404);
  });
});

describe('health', () => {
  it('is alive and ready, and kept by no cache', async () => {
    for (const path of ['/healthz', '/readyz']) {
      const answer = await service.call(path, { token: null });
      expect([answer.status, answer.json]).toEqual([200, { status: 'ok' }]);
      expect(answer.headers.get('cache-control')).toBe('no-store');
    }
  });
});
