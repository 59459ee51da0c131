/**
 * GraphQL over HTTP (the open specification of that name; its audits are a test). One operation a request, by POST or,
 * for queries, by GET.
 */
import type { FastifyInstance, FastifyReply, FastifyRequest, RouteOptions } from 'fastify';
import { type ExecutionResult, execute, OperationTypeNode } from 'graphql';
import { badInput, ProblemError, refuse, unauthenticated } from '../errors.ts';
import { asProblem, negotiate } from '../rest/index.ts';
import type { Admit } from './admit.ts';
import { createContext, type GraphqlContext, type Surroundings } from './context.ts';
import { bodiesOf, bodyOf, type LogDefect, problemErrorOf, RequestRefused } from './error-body.ts';
import { readGraphqlRequest } from './parameters.ts';
import { isIntrospection, type Prepare, type Prepared } from './prepare.ts';

const GRAPHQL_PATH = '/graphql';

export interface HttpDeps extends Surroundings {
  readonly admit: Admit;
  readonly prepare: Prepare;
  readonly openIntrospection: boolean;
}

const JSON_OFFER = { suffix: 'json', mediaType: 'application/json' };
const GRAPHQL_OFFER = { suffix: 'graphql', mediaType: 'application/graphql-response+json' };
const OFFERS = [JSON_OFFER, GRAPHQL_OFFER];
const OK = 200;

const offerFor = (request: FastifyRequest) => negotiate(request.headers.accept, OFFERS);

/** @param offer null: none is accepted, and what has to be said is said in JSON all the same */
function send(
  reply: FastifyReply,
  offer: (typeof OFFERS)[number] | null,
  status: number,
  body: object,
): FastifyReply {
  const { mediaType } = offer ?? JSON_OFFER;
  return reply
    .code(status)
    .headers({
      'content-type': `${mediaType}; charset=utf-8`,
      vary: 'Accept, Authorization',
      'cache-control': 'no-store',
    })
    .send(JSON.stringify(body));
}

function logOf(request: FastifyRequest): LogDefect {
  return (error, problem) => request.log.error({ err: error, problem }, 'an operation failed');
}

/** Only a query is safe to repeat, prefetch and link to; subscriptions need a channel that stays open. */
function checkMethod({ operation }: Prepared, method: string): void {
  const kind = operation.operation;
  if (kind === OperationTypeNode.SUBSCRIPTION) {
    const detail = 'Subscriptions come over WebSocket, protocol graphql-transport-ws, at this same path.';
    throw badInput(detail, { given: kind, allowed: ['query', 'mutation'] });
  }
  if (method === 'POST' || kind === OperationTypeNode.QUERY) return;
  const detail = `A ${kind} goes by POST, not by ${method}.`;
  throw refuse('METHOD_NOT_ALLOWED', detail, { given: method, allowed: ['POST'] }, { allow: 'POST' });
}

/** @param context null: only the schema is asked about, no resolver of ours is called */
function run(
  app: FastifyInstance,
  prepared: Prepared,
  context: GraphqlContext | null,
): Promise<ExecutionResult> | ExecutionResult {
  const { document, operation, variables, source } = prepared;
  if (context === null)
    return execute({
      schema: app.graphql.schema,
      document,
      variableValues: variables,
      operationName: operation.name?.value,
    });
  return app.graphql(source, context, variables, operation.name?.value);
}

/** The status of a request that was not run. */
function refusalStatus(error: unknown, status: number, isPlainJson: boolean): number {
  return error instanceof RequestRefused && error.isFaultOfDocument && isPlainJson ? OK : status;
}

/** The routes of one scope. `ws` is what an upgrade to a socket of the same path is answered by. */
export function registerHttp(scope: FastifyInstance, deps: HttpDeps, ws: RouteOptions['wsHandler']): void {
  const { admit, prepare, openIntrospection } = deps;

  scope.addHook('onRequest', async (request) => {
    // A socket says who it is in its first message.
    if (request.ws) return;
    const isAnonymous = request.headers.authorization === undefined;
    try {
      request.viewer = await admit(request);
    } catch (error) {
      const isMissing = isAnonymous && error instanceof ProblemError && error.status === 401;
      if (!(isMissing && openIntrospection)) throw error;
    }
  });

  scope.setErrorHandler((error, request, reply) => {
    const log = logOf(request);
    const offer = offerFor(request);
    const known = error instanceof RequestRefused ? error : asProblem(error);
    const refusal = known instanceof RequestRefused ? null : problemErrorOf(known, log);
    const errors = bodiesOf(refusal ?? known, () => {});
    const status = refusalStatus(error, errors[0]?.extensions.status ?? 500, offer !== GRAPHQL_OFFER);
    return send(reply.headers(refusal?.headers ?? {}), offer, status, { errors });
  });

  async function handler(request: FastifyRequest, reply: FastifyReply): Promise<FastifyReply> {
    const offer = offerFor(request);
    if (offer === null) {
      const allowed = OFFERS.map(({ mediaType }) => mediaType);
      throw refuse('NOT_ACCEPTABLE', 'No representation that Accept names is on offer.', { allowed });
    }
    const prepared = prepare(readGraphqlRequest(request));
    checkMethod(prepared, request.method);
    const { viewer } = request;
    if (viewer === null && !isIntrospection(prepared)) throw unauthenticated('MISSING');
    const result = await run(scope, prepared, viewer && createContext(deps, viewer));
    const log = logOf(request);
    const { data = null } = result;
    const refusals = (result.errors ?? []).map((error) => ({ error, refusal: problemErrorOf(error, log) }));
    const [first] = refusals;
    if (!first) return send(reply, offer, OK, { data });
    const errors = refusals.map(({ error, refusal }) => bodyOf(refusal.problem, error));
    // Data that came back is 200, whatever went wrong beside it; without any the first problem tells the status.
    if (data) return send(reply, offer, OK, { errors, data });
    return send(reply.headers(first.refusal.headers), offer, first.refusal.status, { errors, data });
  }

  const config = { access: 'SELF' } as const;
  const schema = { hide: true };
  scope.post(GRAPHQL_PATH, { config, schema, handler });
  scope.route({
    method: 'GET',
    url: GRAPHQL_PATH,
    config,
    schema,
    handler,
    ...(ws ? { wsHandler: ws } : {}),
  });
}
