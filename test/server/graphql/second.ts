/** A second process of the service, as far as the database can tell: store, notifications and sockets of its own. */
import { pino } from 'pino';
import { buildApp } from '../../../server/app.ts';
import { createAuthenticator } from '../../../server/auth/index.ts';
import { createOperations } from '../../../server/operations/index.ts';
import { createStore } from '../../../server/store/index.ts';

export interface Second {
  readonly url: string;
  stop(): Promise<void>;
}

export async function startSecond(
  databaseUrl: string,
  options: { readonly openIntrospection?: boolean } = {},
): Promise<Second> {
  const store = await createStore({ databaseUrl });
  const version = '0.0.0-test';
  const operations = createOperations({
    store,
    version,
    limits: { requestsPerSecond: 100_000, requestBurst: 100_000 },
  });
  const authenticator = createAuthenticator({ store });
  const logger = pino({ level: 'silent' });
  const config = { trustProxy: false };
  const app = await buildApp({ store, operations, authenticator, config, logger, version, ...options });
  const url = await app.listen({ port: 0, host: '127.0.0.1' });
  return {
    url,
    async stop() {
      await app.close();
      authenticator.close();
      await store.close();
    },
  };
}
