import { serverAudits } from 'graphql-http';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { type Service, startService } from '../rest/service.ts';

let service: Service;
beforeAll(async () => {
  service = await startService();
});
afterAll(() => service.stop());

describe('GraphQL over HTTP', () => {
  // The audits of graphql-http 1.23.1, the reference implementation of the specification.
  const audits = serverAudits({
    url: () => `${service.url}/graphql`,
    fetchFn: (url: string, init: RequestInit = {}) =>
      fetch(url, {
        ...init,
        headers: {
          authorization: `Bearer ${service.tokens.READER}`,
          ...(init.headers as Record<string, string>),
        },
      }),
  });
  for (const { id, name, fn } of audits) {
    it(`${id} ${name} [published]`, async () => {
      const { status, ...rest } = await fn();
      expect({ status, ...(status === 'ok' ? {} : rest) }).toEqual({ status: 'ok' });
    });
  }
});
