/**
 * Who may call a route. Every route states its rule in `config.access`; the process refuses to start while one has
 * none, so that a route nobody thought about is closed by construction and not by luck.
 */
import type { FastifyInstance, FastifyRequest, RouteOptions } from 'fastify';
import { type Action, type Authenticator, authorise, type Viewer } from '../../auth/index.ts';
import { ProblemError, rateLimited, refuse } from '../../errors.ts';
import type { TokenBuckets } from '../protocol/index.ts';

/**
 * An action of the one table of rights; PUBLIC: nobody is asked who they are; OPERATOR: from the machine itself or an
 * administrator; SELF: the route admits for itself (GraphQL knows the operation only after reading it).
 */
export type Access = Action | 'PUBLIC' | 'OPERATOR' | 'SELF';

declare module 'fastify' {
  interface FastifyContextConfig {
    access?: Access;
  }
  interface FastifyRequest {
    /** Set on every route whose access is an action. */
    viewer: Viewer | null;
  }
}

/** What of a request tells who asks. */
export interface Caller {
  readonly ip: string;
  readonly headers: { readonly authorization?: string | undefined };
}

/** Believes the token of a request and counts the request against its rate. Throws UNAUTHENTICATED, RATE_LIMITED. */
export type Admit = (caller: Caller) => Promise<Viewer>;

export interface RateLimits {
  readonly perSecond: number;
}

export function createAdmit(authenticator: Authenticator, buckets: TokenBuckets, rate: RateLimits): Admit {
  return async (request) => {
    let viewer: Viewer;
    try {
      viewer = await authenticator.authenticate(request.headers.authorization);
    } catch (error) {
      if (!(error instanceof ProblemError) || error.status !== 401) throw error;
      // Guessing tokens costs a look-up each: addresses that send wrong ones are slowed down like a token is.
      const wait = buckets.take(`address ${request.ip}`);
      throw wait > 0 ? rateLimited(wait, rate.perSecond) : error;
    }
    const wait = buckets.take(viewer.tokenId);
    if (wait > 0) throw rateLimited(wait, rate.perSecond);
    return viewer;
  };
}

/** Loopback without a proxy in between, which would make the whole world look local. */
function isFromThisMachine(request: FastifyRequest): boolean {
  const address = request.socket.remoteAddress ?? '';
  const local = address === '::1' || /^(::ffff:)?127\./.test(address);
  return local && request.headers['x-forwarded-for'] === undefined && request.headers.forwarded === undefined;
}

export interface KnownRoute {
  readonly method: string;
  readonly url: string;
  readonly access: Access | undefined;
}

const methodsOf = (route: RouteOptions): string[] => [route.method].flat();

/** Adds the check to every request and returns the routes as they are registered from now on. */
export function registerAccess(app: FastifyInstance, admit: Admit): readonly KnownRoute[] {
  const routes: KnownRoute[] = [];
  app.addHook('onRoute', (route) => {
    for (const method of methodsOf(route)) {
      // Read late: plugins may still be given their rule by a hook of the scope that registers them.
      routes.push({
        method,
        url: route.url,
        get access() {
          return route.config?.access;
        },
      });
    }
  });
  app.addHook('onReady', async () => {
    const open = routes.filter((route) => route.access === undefined);
    if (open.length === 0) return;
    const list = open.map((route) => `${route.method} ${route.url}`).join(', ');
    throw new Error(`No access rule for ${list}.`);
  });
  app.decorateRequest('viewer', null);
  app.addHook('onRequest', async (request) => {
    const { access } = request.routeOptions.config;
    if (access === 'PUBLIC' || access === 'SELF' || request.is404) return;
    if (access === undefined) throw refuse('FORBIDDEN', 'This path has no access rule.');
    if (access === 'OPERATOR') {
      if (isFromThisMachine(request)) return;
      authorise(await admit(request), 'metrics.read');
      return;
    }
    const viewer = await admit(request);
    authorise(viewer, access);
    request.viewer = viewer;
  });
  return routes;
}

/** The viewer of a route whose access is an action. */
export function viewerOf(request: FastifyRequest): Viewer {
  if (!request.viewer) throw new Error(`${request.routeOptions.url} has no viewer`);
  return request.viewer;
}
