/**
 * Subscriptions over WebSocket, protocol graphql-transport-ws. A socket lives as long as its token: it ends with 4403
 * when the token is revoked, by whichever process, or expires.
 */
import type { WebSocket } from '@fastify/websocket';
import type { FastifyBaseLogger, FastifyRequest } from 'fastify';
import type { ExecutionArgs, ExecutionResult, GraphQLError, GraphQLSchema } from 'graphql';
import { CloseCode, type Context, makeServer, type SubscribeMessage } from 'graphql-ws';
import type { Limits } from '../../schema/limits.ts';
import type { Authenticator, Viewer } from '../auth/index.ts';
import { tooManyOpen } from '../errors.ts';
import type { StoreEvent } from '../store/store.ts';
import type { Admit } from './admit.ts';
import { createContext, type Surroundings } from './context.ts';
import { bodiesOf, bodyOf, type LogDefect, problemErrorOf } from './error-body.ts';
import { readMembers } from './parameters.ts';
import type { Prepare } from './prepare.ts';

export interface SocketDeps extends Surroundings {
  readonly admit: Admit;
  readonly authenticator: Authenticator;
  readonly limits: Limits;
  readonly log: FastifyBaseLogger;
  readonly prepare: Prepare;
  readonly schema: GraphQLSchema;
}

export interface Sockets {
  handle(socket: WebSocket, request: FastifyRequest): void;
  /** Says goodbye to every client; does not wait for them. */
  drain(): void;
}

/** RFC 6455 section 7.4.1. */
const GOING_AWAY = 1001;
/** Registered by IANA beside the codes of RFC 6455: a condition of this moment, come back. */
const TRY_AGAIN_LATER = 1013;

/** Often enough to keep proxies from taking the line for idle, ms. */
const PING_MS = 25_000;
/** What a client gets to answer a goodbye before its line is cut, ms. */
const GOODBYE_MS = 2_000;
/** Longest that one timer can run (a signed 32-bit number of ms). */
const LONGEST_TIMER_MS = 2 ** 31 - 1;

interface Extra {
  readonly socket: WebSocket;
  readonly request: FastifyRequest;
  /** The header value, from the first message or, without one there, from the upgrade. */
  authorization: string | undefined;
  viewer: Viewer | null;
  isAlive: boolean;
  expiry: NodeJS.Timeout | undefined;
}

type Connection = Context<Record<string, unknown> | undefined, Extra>;

function headerOf({ connectionParams, extra }: Connection): string | undefined {
  for (const name of ['authorization', 'Authorization']) {
    const value = connectionParams?.[name];
    if (typeof value === 'string') return value;
  }
  return extra.request.headers.authorization;
}

/** Closing reasons have 123 bytes (RFC 6455 section 5.5). */
const reasonOf = (text: string): string => text.slice(0, 120);

export function createSockets(deps: SocketDeps): Sockets {
  const { admit, authenticator, limits, notifications, prepare, schema } = deps;
  const connections = new Set<Connection>();

  const logDefect: LogDefect = (error, problem) =>
    deps.log.error({ err: error, problem }, 'an operation failed');

  /** Ends the socket as the refusal asks for: with the token's end for good, else for now. */
  function close({ extra }: Connection, error: unknown): void {
    const { problem } = problemErrorOf(error, logDefect);
    const isAccess = problem.status === 401 || problem.status === 403;
    extra.socket.close(isAccess ? CloseCode.Forbidden : TRY_AGAIN_LATER, reasonOf(problem.detail));
  }

  const admitAgain = ({ extra: { authorization, request } }: Connection): Promise<Viewer> =>
    admit({ ip: request.ip, headers: { authorization } });

  /** Closes it if its token has ended. */
  function checkToken(connection: Connection): void {
    authenticator.authenticate(connection.extra.authorization).then(
      () => armExpiry(connection),
      (error: unknown) => {
        // That the database is away says nothing about the token: the next reconnection tells.
        if (problemErrorOf(error, logDefect).status === 401) close(connection, error);
      },
    );
  }

  function armExpiry(connection: Connection): void {
    const { extra } = connection;
    clearTimeout(extra.expiry);
    const expiresAt = extra.viewer?.expiresAt;
    if (!expiresAt || !connections.has(connection)) return;
    const left = Math.max(0, expiresAt.getTime() - Date.now());
    extra.expiry = setTimeout(() => checkToken(connection), Math.min(left, LONGEST_TIMER_MS));
    extra.expiry.unref();
  }

  function hear(event: StoreEvent): void {
    if (event.kind !== 'TOKEN' && event.kind !== 'RECONNECTED') return;
    for (const connection of connections) {
      // After an outage any token may have been revoked unheard.
      if (event.kind === 'RECONNECTED' || connection.extra.viewer?.tokenId === event.id)
        checkToken(connection);
    }
  }
  const unsubscribe = notifications.subscribe(hear);

  const ping = setInterval(() => {
    for (const { extra } of connections) {
      if (!extra.isAlive) extra.socket.terminate();
      extra.isAlive = false;
      extra.socket.ping();
    }
  }, PING_MS).unref();

  /** The one being asked for is among them. */
  function openOf(tokenId: string): number {
    let open = 0;
    for (const { extra, subscriptions } of connections) {
      if (extra.viewer?.tokenId === tokenId) open += Object.keys(subscriptions).length;
    }
    return open;
  }

  async function onConnect(connection: Connection): Promise<boolean> {
    const { extra } = connection;
    extra.authorization = headerOf(connection);
    try {
      extra.viewer = await admitAgain(connection);
    } catch (error) {
      close(connection, error);
      return false;
    }
    connections.add(connection);
    // A revocation that was told between the look and this line closes it here.
    checkToken(connection);
    return extra.socket.readyState === extra.socket.OPEN;
  }

  async function onSubscribe(connection: Connection, { payload }: SubscribeMessage) {
    try {
      const viewer = await admitAgain(connection);
      if (openOf(viewer.tokenId) > limits.subscriptions)
        throw tooManyOpen('subscriptions', limits.subscriptions);
      const { document, operation, variables } = prepare(readMembers(payload));
      return {
        schema,
        document,
        operationName: operation.name?.value,
        variableValues: variables,
        contextValue: createContext(deps, viewer),
      } as ExecutionArgs;
    } catch (error) {
      // Formatted already: what stands in them is what is sent.
      return bodiesOf(error, logDefect) as unknown as readonly GraphQLError[];
    }
  }

  function withProblems({ data = null, errors }: Pick<ExecutionResult, 'data' | 'errors'>): ExecutionResult {
    if (!errors) return { data };
    const bodies = errors.map((error) => bodyOf(problemErrorOf(error, logDefect).problem, error));
    return { data, errors: bodies as unknown as readonly GraphQLError[] };
  }

  const server = makeServer<Record<string, unknown> | undefined, Extra>({
    onConnect,
    onSubscribe,
    onNext: (_, __, ___, result) => withProblems(result as ExecutionResult),
    onClose(connection) {
      clearTimeout(connection.extra.expiry);
      connections.delete(connection);
    },
  });

  return {
    handle(socket, request) {
      const extra: Extra = {
        socket,
        request,
        authorization: undefined,
        viewer: null,
        isAlive: true,
        expiry: undefined,
      };
      socket.on('pong', () => {
        extra.isAlive = true;
      });
      const closed = server.opened(
        {
          protocol: socket.protocol,
          send: (data) => sendTo(socket, data),
          close: (code, reason) => socket.close(code, reason),
          onMessage(take) {
            socket.on('message', (data) => {
              take(String(data)).catch((error: unknown) => {
                logDefect(error, problemErrorOf(error, () => {}).problem);
                socket.close(CloseCode.InternalServerError, 'Internal error');
              });
            });
          },
        },
        extra,
      );
      socket.once('close', (code, reason) => {
        closed(code, String(reason)).catch((error: unknown) => {
          logDefect(error, problemErrorOf(error, () => {}).problem);
        });
      });
    },
    drain() {
      unsubscribe();
      clearInterval(ping);
      for (const { extra } of connections) {
        extra.socket.close(GOING_AWAY, 'The service is stopping');
        setTimeout(() => extra.socket.terminate(), GOODBYE_MS).unref();
      }
    },
  };
}

/** Resolves when it is written, or when there is nobody to write to any more. */
function sendTo(socket: WebSocket, data: string): Promise<void> {
  return new Promise((resolve) => {
    if (socket.readyState !== socket.OPEN) resolve();
    else socket.send(data, () => resolve());
  });
}
