/** Headers every answer carries. No cross-origin access: scripts and instruments need none, pages are our own. */
import { randomBytes } from 'node:crypto';
import type { FastifyInstance } from 'fastify';

/** An API answer is data: nothing in it may run, load or be framed. Pages replace this with their own policy. */
const DATA_POLICY = "default-src 'none'; frame-ancestors 'none'";

/** A year, s. */
const STRICT_TRANSPORT_SECONDS = 31_536_000;

const REQUEST_ID = /^[A-Za-z0-9._-]{1,64}$/;

/** Ids that do not repeat across processes; a caller's own id is kept so that both logs tell the same story. */
export function createRequestIds(): (request: {
  headers: Record<string, string | string[] | undefined>;
}) => string {
  const process = randomBytes(6).toString('base64url').replaceAll(/[-_]/g, '0');
  let count = 0;
  return (request) => {
    const given = request.headers['x-request-id'];
    if (typeof given === 'string' && REQUEST_ID.test(given)) return given;
    count += 1;
    return `${process}.${count.toString(36)}`;
  };
}

export function registerHeaders(app: FastifyInstance): void {
  app.addHook('onRequest', (request, reply, done) => {
    reply.headers({
      'x-request-id': request.id,
      'x-content-type-options': 'nosniff',
      'referrer-policy': 'no-referrer',
      'content-security-policy': DATA_POLICY,
      'cross-origin-resource-policy': 'same-origin',
    });
    if (request.protocol === 'https') {
      reply.header('strict-transport-security', `max-age=${STRICT_TRANSPORT_SECONDS}`);
    }
    if (request.url.startsWith('/v1/')) {
      reply.headers({ vary: 'Accept, Authorization', 'cache-control': 'private, no-cache' });
    }
    done();
  });
  // The framework adds a charset; RFC 8259 section 11 knows none.
  app.addHook('onSend', (_request, reply, payload, done) => {
    const type = reply.getHeader('content-type');
    if (type === 'application/json; charset=utf-8') reply.header('content-type', 'application/json');
    done(null, payload);
  });
}
