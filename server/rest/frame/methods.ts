/** A path that exists but not with this method is 405 and says which it takes (RFC 9110 section 15.5.6); else 404. */
import type { FastifyInstance } from 'fastify';
import { refuse } from '../../errors.ts';
import type { KnownRoute } from './access.ts';
import { sendProblem } from './problems.ts';

/** A route's pattern as the router means it: `:name` is one segment, a final `*` anything. */
function patternOf(url: string): RegExp {
  const source = url
    .replace(/[.+?^${}()|[\]\\]/g, '\\$&')
    .replace(/:[A-Za-z]+/g, '[^/]+')
    .replace(/\*$/, '.*');
  return new RegExp(`^${source}$`);
}

export function registerMethods(app: FastifyInstance, routes: readonly KnownRoute[]): void {
  let patterns: readonly { readonly method: string; readonly pattern: RegExp }[] = [];
  app.addHook('onReady', async () => {
    patterns = routes.map(({ method, url }) => ({ method, pattern: patternOf(url) }));
  });
  app.setNotFoundHandler((request, reply) => {
    const path = request.url.split('?', 1)[0]!;
    const methods = new Set(patterns.filter(({ pattern }) => pattern.test(path)).map(({ method }) => method));
    if (methods.size === 0) {
      return sendProblem(request, reply, refuse('NOT_FOUND', `There is nothing at ${path.slice(0, 200)}.`));
    }
    const allow = [...methods].sort();
    const detail = `${path} takes ${allow.join(', ')}, not ${request.method}.`;
    const more = { given: request.method, allowed: allow };
    return sendProblem(
      request,
      reply,
      refuse('METHOD_NOT_ALLOWED', detail, more, { allow: allow.join(', ') }),
    );
  });
}
