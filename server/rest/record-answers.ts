/** From records to answers: one as text, or a page of them. */
import type { FastifyReply, FastifyRequest } from 'fastify';
import type { Connection } from '../operations/index.ts';
import { answerJson } from './reply.ts';
import { type RestDeps, wiringOf } from './rest.ts';
import type { Wiring } from './wire.ts';

type Wires<R> = (wiring: Wiring, records: readonly R[]) => Promise<readonly unknown[]>;

export async function recordText<R>(
  deps: RestDeps,
  request: FastifyRequest,
  wires: Wires<R>,
  record: R,
): Promise<string> {
  const [wire] = await wires(wiringOf(deps, request), [record]);
  return JSON.stringify(wire);
}

/** A page of a list with, where there is more, `Link: <…>; rel="next"` (RFC 8288). */
export async function answerPage<R>(
  deps: RestDeps,
  request: FastifyRequest,
  reply: FastifyReply,
  { edges, pageInfo }: Connection<R>,
  wires: Wires<R>,
): Promise<FastifyReply> {
  const nodes = await wires(
    wiringOf(deps, request),
    edges.map(({ node }) => node),
  );
  if (pageInfo.hasNextPage && pageInfo.endCursor !== null) {
    const [path = '', search = ''] = request.url.split('?', 2);
    const next = new URLSearchParams(search);
    next.set('after', pageInfo.endCursor);
    reply.header('link', `<${path}?${next}>; rel="next"`);
  }
  return answerJson(request, reply, {
    edges: edges.map(({ cursor }, index) => ({ cursor, node: nodes[index] })),
    pageInfo,
  });
}
