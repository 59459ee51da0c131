/** For whoever operates the service: is it alive, is it ready, its numbers. */
import type { FastifyInstance } from 'fastify';
import { z } from 'zod';
import { serviceUnavailable } from '../errors.ts';
import type { Store } from '../store/store.ts';
import { describe } from './describe.ts';
import type { Metrics } from './frame/index.ts';
import { JSON_TYPE } from './reply.ts';

const TAG = 'Operation';
const statusAnswer = z.strictObject({ status: z.literal('ok') });
const OK = JSON.stringify({ status: 'ok' });

export function registerOperating(app: FastifyInstance, store: Store, metrics: Metrics): void {
  app.get('/healthz', {
    config: { access: 'PUBLIC' },
    schema: describe({
      tag: TAG,
      summary: 'Whether the process answers at all',
      isPublic: true,
      answers: { 200: { about: 'It does.', content: { [JSON_TYPE]: statusAnswer } } },
    }),
    handler: async (_request, reply) =>
      reply.headers({ 'content-type': JSON_TYPE, 'cache-control': 'no-store' }).send(OK),
  });

  app.get('/readyz', {
    config: { access: 'PUBLIC' },
    schema: describe({
      tag: TAG,
      summary: 'Whether requests can be served: 503 while the database is away',
      isPublic: true,
      answers: { 200: { about: 'They can.', content: { [JSON_TYPE]: statusAnswer } } },
    }),
    handler: async (_request, reply) => {
      const isUp = await store.ping().catch(() => false);
      if (!isUp) throw serviceUnavailable('The database cannot be reached at the moment.');
      return reply.headers({ 'content-type': JSON_TYPE, 'cache-control': 'no-store' }).send(OK);
    },
  });

  app.get('/metrics', {
    config: { access: 'OPERATOR' },
    schema: describe({
      tag: TAG,
      summary: 'Numbers for Prometheus; from this machine, or with an ADMIN token',
      answers: { 200: { about: 'Text exposition format.', content: { 'text/plain': z.string() } } },
    }),
    handler: async (_request, reply) =>
      reply
        .headers({ 'content-type': metrics.contentType, 'cache-control': 'no-store' })
        .send(await metrics.text()),
  });
}
