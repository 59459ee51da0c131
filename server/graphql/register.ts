/** The GraphQL door of the application: `/graphql` over HTTP and WebSocket, `/graphiql` for people. */
import websocket from '@fastify/websocket';
import type { FastifyInstance } from 'fastify';
import { handleProtocols } from 'graphql-ws';
import mercurius from 'mercurius';
import type { Authenticator } from '../auth/index.ts';
import type { Operations } from '../operations/index.ts';
import type { Notifications } from '../store/store.ts';
import type { Admit } from './admit.ts';
import { registerGraphiql } from './graphiql.ts';
import { registerHttp } from './http.ts';
import { createPrepare } from './prepare.ts';
import { createSchema } from './schema.ts';
import { createSockets } from './socket.ts';

export interface GraphqlDeps {
  readonly operations: Operations;
  readonly authenticator: Authenticator;
  readonly notifications: Notifications;
  readonly admit: Admit;
  /** Whether the schema may be asked about without a token. */
  readonly openIntrospection: boolean;
}

/** A document is compiled when it comes for the second time. */
const COMPILED_FROM = 1;
/** Compiled documents kept. */
const KEPT_DOCUMENTS = 200;

/**
 * Before the other routes: an upgrade to one of theirs is then closed and not left open.
 * @throws Error when schema, resolvers and access rules do not fit together
 */
export function registerGraphql(app: FastifyInstance, deps: GraphqlDeps): void {
  const { operations } = deps;
  const { limits } = operations;
  const schema = createSchema();
  const prepare = createPrepare(schema, limits);
  const sockets = createSockets({ ...deps, limits, log: app.log, prepare, schema });

  // An upgrade that was answered instead of taken (401, 404) leaves a line that nobody reads, and so nobody ends.
  app.addHook('onResponse', (request, _reply, done) => {
    if (request.raw.headers.upgrade !== undefined) request.raw.socket.destroy();
    done();
  });
  app.register(websocket, {
    options: { maxPayload: limits.bodyBytes, handleProtocols },
    preClose(done) {
      sockets.drain();
      this.websocketServer.close();
      done();
    },
  });
  app.register(mercurius, {
    schema,
    jit: COMPILED_FROM,
    cache: KEPT_DOCUMENTS,
    routes: false,
    // Errors become problems where the answer is made.
    errorFormatter: ({ data, errors }) => ({
      statusCode: 200,
      response: { data: data ?? null, ...(errors ? { errors } : {}) },
    }),
  });
  app.register(async (scope) => registerHttp(scope, { ...deps, prepare }, sockets.handle));
  app.register(async (scope) => registerGraphiql(scope));
}
