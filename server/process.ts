/**
 * A process of the service, put together: database, store, worker, API, in this order; taken apart in the reverse one.
 * HTTP drains first, then the queue's jobs end or are given back, and the database stops last.
 */
import type { AddressInfo } from 'node:net';
import type { Logger } from 'pino';
import { LIMITS } from '../schema/limits.ts';
import { buildApp } from './app.ts';
import { createAuthenticator, ensureFirstAdmin } from './auth/index.ts';
import { type Config, ConfigurationError } from './config.ts';
import { startEmbedded } from './embedded/index.ts';
import { startWorker } from './jobs/index.ts';
import { createOperations } from './operations/index.ts';
import { createStore, type Store } from './store/index.ts';
import { readVersion } from './version.ts';

export interface Parts {
  readonly api: boolean;
  readonly worker: boolean;
  /** May start a PostgreSQL of its own when none is configured. */
  readonly embedded: boolean;
}

export interface RunningProcess {
  /** `http://host:port`; null without the API. */
  readonly url: string | null;
  /** Where the started PostgreSQL keeps its data; null when one was configured. */
  readonly dataFolder: string | null;
  /** The first admin token, if this process made it: for the terminal, once, never for a logger. */
  readonly firstAdminToken: string | null;
  readonly store: Store;
  /** Safe to call twice. */
  stop(): Promise<void>;
}

type Closer = () => Promise<void>;

function urlOf({ address, family, port }: AddressInfo): string {
  return `http://${family === 'IPv6' ? `[${address}]` : address}:${port}`;
}

async function startApi(config: Config, store: Store, logger: Logger, closers: Closer[]): Promise<string> {
  const version = readVersion();
  const limits = {
    ...LIMITS,
    queuedRequests: config.queueLimit,
    requestsPerSecond: config.ratePerS,
    requestBurst: 2 * config.ratePerS,
  };
  const operations = createOperations({ store, version, limits });
  const authenticator = createAuthenticator({ store });
  closers.push(async () => authenticator.close());
  const { openIntrospection } = config;
  const app = await buildApp({
    store,
    operations,
    authenticator,
    config,
    logger,
    version,
    openIntrospection,
  });
  closers.push(() => app.close());
  await app.listen({ host: config.host, port: config.port });
  return urlOf(app.server.address() as AddressInfo);
}

async function startParts(
  config: Config,
  parts: Parts,
  logger: Logger,
  closers: Closer[],
): Promise<Omit<RunningProcess, 'stop'>> {
  let { databaseUrl } = config;
  let dataFolder: string | null = null;
  if (databaseUrl === undefined) {
    if (!parts.embedded)
      throw new ConfigurationError(
        'DATABASE_URL is needed: this process does not start a database of its own.',
      );
    const database = await startEmbedded({ folder: config.dataFolder, logger });
    closers.push(() => database.stop());
    databaseUrl = database.url;
    dataFolder = database.folder;
  }
  const store = await createStore({ databaseUrl, poolSize: config.poolSize, logger });
  closers.push(() => store.close());
  const firstAdminToken = parts.api ? await ensureFirstAdmin(store, config.adminToken) : null;
  if (parts.worker) {
    const worker = await startWorker({ ...config, store, logger });
    closers.push(() => worker.stop());
    logger.info({ threads: config.threads }, 'worker ready');
  }
  const url = parts.api ? await startApi(config, store, logger, closers) : null;
  return { url, dataFolder, firstAdminToken, store };
}

async function closeAll(closers: Closer[], logger: Logger): Promise<void> {
  for (let close = closers.pop(); close !== undefined; close = closers.pop())
    await close().catch((error: unknown) => logger.error({ err: error }, 'a part did not end cleanly'));
}

/**
 * Starts what `parts` names and returns when it serves. Whatever was started is ended again when a later part fails.
 * @throws ConfigurationError; StoreUnavailable when a configured database is away; Error when the port is taken.
 */
export async function startProcess(config: Config, parts: Parts, logger: Logger): Promise<RunningProcess> {
  const closers: Closer[] = [];
  try {
    const started = await startParts(config, parts, logger, closers);
    let stopping: Promise<void> | undefined;
    return {
      ...started,
      stop() {
        stopping ??= closeAll(closers, logger);
        return stopping;
      },
    };
  } catch (error) {
    await closeAll(closers, logger);
    throw error;
  }
}
