/** The whole service as one test file needs it: a database of its own, the application on a real port, a token a role. */
import type { FastifyInstance } from 'fastify';
import { pino } from 'pino';
import { buildApp } from '../../../server/app.ts';
import { createAuthenticator, ensureFirstAdmin, generateToken } from '../../../server/auth/index.ts';
import { createOperations, type Operations, wireId } from '../../../server/operations/index.ts';
import { createStore, type Role, type Store } from '../../../server/store/index.ts';
import { createTestDatabase } from '../../support/postgres.ts';
import { type InventedChip, inventedChip } from './invented-chips.ts';

export const ROLES = ['READER', 'DESIGNER', 'INSTRUMENT', 'ADMIN'] as const satisfies readonly Role[];

export interface ServiceOptions {
  /** Where the service finds its database, given where it is: for tests that stand in between. */
  readonly databaseUrl?: (url: string) => Promise<string>;
  readonly ratePerS?: number;
  readonly trustProxy?: boolean;
  /** Lines of the log, as they are written. */
  readonly logLine?: (line: string) => void;
}

export interface Answer {
  readonly status: number;
  readonly headers: Headers;
  readonly text: string;
  // biome-ignore lint/suspicious/noExplicitAny: bodies are checked member by member by the tests
  readonly json: any;
}

export interface Ask {
  readonly method?: string;
  readonly token?: string | null;
  readonly headers?: Readonly<Record<string, string>>;
  /** Sent as JSON; a string is sent as it is. */
  readonly body?: unknown;
  readonly signal?: AbortSignal;
}

export interface Service {
  readonly app: FastifyInstance;
  readonly store: Store;
  readonly operations: Operations;
  readonly url: string;
  readonly tokens: Readonly<Record<Role, string>>;
  /** As DESIGNER when no token is named. */
  call(path: string, ask?: Ask): Promise<Answer>;
  newToken(
    role: Role,
    expiresAt?: Date,
    actor?: string,
  ): Promise<{ readonly token: string; readonly id: string }>;
  revoke(tokenId: string): Promise<void>;
  registerChip(serial: string, chip?: InventedChip): Promise<Answer>;
  stop(): Promise<void>;
}

/** Far above what tests send, so that only the test of the rate meets it. */
const RATE_PER_S = 100_000;

export async function startService(options: ServiceOptions = {}): Promise<Service> {
  const database = await createTestDatabase();
  const databaseUrl = options.databaseUrl ? await options.databaseUrl(database.url) : database.url;
  const store = await createStore({ databaseUrl });
  const ratePerS = options.ratePerS ?? RATE_PER_S;
  const limits = { requestsPerSecond: ratePerS, requestBurst: 2 * ratePerS };
  const operations = createOperations({ store, version: '0.0.0-test', limits });
  const authenticator = createAuthenticator({ store });
  const { logLine } = options;
  const logger = logLine ? pino({ level: 'info' }, { write: logLine }) : pino({ level: 'silent' });
  const config = { trustProxy: options.trustProxy ?? false };
  const app = await buildApp({ store, operations, authenticator, config, logger, version: '0.0.0-test' });
  await app.listen({ port: 0, host: '127.0.0.1' });
  const address = app.server.address();
  if (typeof address !== 'object' || address === null) throw new Error('not listening');
  const url = `http://127.0.0.1:${address.port}`;

  const admin = generateToken().token;
  await ensureFirstAdmin(store, admin);
  const service: Omit<Service, 'tokens'> = {
    app,
    store,
    operations,
    url,
    async call(path, ask = {}) {
      const { method = 'GET', token = tokens.DESIGNER, headers = {}, body, signal } = ask;
      const response = await fetch(`${url}${path}`, {
        method,
        headers: {
          ...(token === null ? {} : { authorization: `Bearer ${token}` }),
          ...(body === undefined ? {} : { 'content-type': 'application/json' }),
          ...headers,
        },
        ...(body === undefined ? {} : { body: typeof body === 'string' ? body : JSON.stringify(body) }),
        ...(signal ? { signal } : {}),
      });
      const text = await response.text();
      const isJson = /json/.test(response.headers.get('content-type') ?? '') && text !== '';
      return {
        status: response.status,
        headers: response.headers,
        text,
        json: isJson ? JSON.parse(text) : undefined,
      };
    },
    async newToken(role, expiresAt, actor = `invented ${role.toLowerCase()}`) {
      const viewer = await authenticator.authenticate(`Bearer ${admin}`);
      const made = await operations.createToken(viewer, {
        actor,
        role,
        label: 'test',
        ...(role === 'INSTRUMENT' ? { actorKind: 'INSTRUMENT' } : {}),
        ...(expiresAt ? { expiresAt: expiresAt.toISOString() } : {}),
      });
      return { token: made.secret, id: wireId('tok', made.record.id) };
    },
    async revoke(id) {
      await operations.revokeToken(await authenticator.authenticate(`Bearer ${admin}`), { id });
    },
    registerChip(serial, chip) {
      return service.call(`/v1/chips/${serial}`, {
        method: 'PUT',
        headers: { 'if-none-match': '*' },
        body: { model: inventedChip(chip) },
      });
    },
    async stop() {
      await app.close();
      authenticator.close();
      await store.close();
      await database.drop();
    },
  };
  const tokens: Record<Role, string> = { READER: '', DESIGNER: '', INSTRUMENT: '', ADMIN: admin };
  for (const role of ROLES) if (role !== 'ADMIN') tokens[role] = (await service.newToken(role)).token;
  return { ...service, tokens };
}
