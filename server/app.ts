/**
 * The HTTP application: every part is made elsewhere and put together here, in the order in which a request meets it.
 * Headers, then access, then the body, then the handler; whatever is refused on the way leaves as a problem.
 */
import Fastify, { type FastifyBaseLogger, type FastifyInstance, LogController } from 'fastify';
import type { Logger } from 'pino';
import type { Authenticator } from './auth/index.ts';
import type { Config } from './config.ts';
import { registerGraphql } from './graphql/index.ts';
import type { Operations } from './operations/index.ts';
import {
  clientErrorHandler,
  createAdmit,
  createRequestIds,
  createTokenBuckets,
  createWaiting,
  registerAccess,
  registerBodies,
  registerDocument,
  registerDraining,
  registerHeaders,
  registerMethods,
  registerMetrics,
  registerOperating,
  registerPages,
  registerProblems,
  registerRest,
  sendProblem,
} from './rest/index.ts';
import type { Store } from './store/store.ts';

export interface AppDeps {
  readonly store: Store;
  readonly operations: Operations;
  readonly authenticator: Authenticator;
  readonly config: Pick<Config, 'trustProxy'>;
  readonly logger: Logger;
  /** Version of the program, for the document. */
  readonly version: string;
  /** Whether the GraphQL schema may be asked about without a token: a demo's convenience. */
  readonly openIntrospection?: boolean;
}

/** Time for a whole request to arrive, ms: a megabyte over a slow line, and no connection held open by trickling. */
const REQUEST_TIMEOUT_MS = 30_000;
/** Longer than the idle limits of ordinary proxies (60 s), so that the proxy closes first and loses no request. */
const KEEP_ALIVE_MS = 75_000;
/** Longest path parameter: `dsn_` and 64 digits, names of 64 with a suffix. */
const LONGEST_PARAMETER = 120;

/** Not listening yet. Rejects when a route has no access rule. */
export async function buildApp(deps: AppDeps): Promise<FastifyInstance> {
  const { store, operations, authenticator, config, logger, version } = deps;
  const { limits } = operations;
  const app: FastifyInstance = Fastify({
    loggerInstance: logger as FastifyBaseLogger,
    // One line a request, written where the metrics are counted.
    logController: new LogController({ disableRequestLogging: true }),
    genReqId: createRequestIds(),
    bodyLimit: limits.bodyBytes,
    requestTimeout: REQUEST_TIMEOUT_MS,
    keepAliveTimeout: KEEP_ALIVE_MS,
    trustProxy: typeof config.trustProxy === 'boolean' ? config.trustProxy : [...config.trustProxy],
    // A request that arrives while the process drains is served; its connection is closed after it.
    return503OnClosing: false,
    routerOptions: { maxParamLength: LONGEST_PARAMETER },
    frameworkErrors: (error, request, reply) => sendProblem(request, reply, error),
    clientErrorHandler,
  });
  // Rules are checked once, in the operations; here they only describe. Handlers send text that is already JSON.
  app.setValidatorCompiler(() => (value) => ({ value }));
  app.setSerializerCompiler(() => JSON.stringify);

  const waiting = createWaiting(store.notifications, limits);
  const rate = { perSecond: limits.requestsPerSecond, burst: limits.requestBurst };
  const admit = createAdmit(
    authenticator,
    createTokenBuckets(rate, () => performance.now()),
    rate,
  );

  registerProblems(app);
  registerHeaders(app);
  registerDraining(app, waiting);
  const metrics = registerMetrics(app, store, waiting);
  const routes = registerAccess(app, admit);
  registerBodies(app);
  registerMethods(app, routes);
  registerDocument(app, version);
  registerGraphql(app, {
    operations,
    authenticator,
    notifications: store.notifications,
    admit,
    openIntrospection: deps.openIntrospection ?? false,
  });
  app.after(() => {
    registerRest(app, { operations, authenticator, waiting });
    registerOperating(app, store, metrics);
    registerPages(app);
  });

  await app.ready();
  return app;
}
