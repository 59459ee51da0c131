/** Who I am to the service, and what the service is. */
import type { FastifyInstance } from 'fastify';
import { viewerView } from '../views/index.ts';
import { meAnswer, serviceAnswer } from './answers.ts';
import { CONDITIONAL_HEADERS, describe } from './describe.ts';
import { viewerOf } from './frame/index.ts';
import { answerJson, JSON_TYPE } from './reply.ts';
import type { RestDeps } from './rest.ts';

const TAG = 'Service';

export function registerViewer(app: FastifyInstance, { operations }: RestDeps): void {
  app.get('/v1/me', {
    config: { access: 'viewer.read' },
    schema: describe({
      tag: TAG,
      summary: 'The actor and role of the token in use',
      headers: CONDITIONAL_HEADERS,
      answers: {
        200: { about: 'Who asks.', content: { [JSON_TYPE]: meAnswer } },
        304: { about: 'Unchanged.' },
      },
    }),
    handler: async (request, reply) =>
      answerJson(request, reply, viewerView(operations.me(viewerOf(request)))),
  });

  app.get('/v1/service', {
    config: { access: 'service.read' },
    schema: describe({
      tag: TAG,
      summary: 'Version, engine and limits',
      headers: CONDITIONAL_HEADERS,
      answers: {
        200: { about: 'The service.', content: { [JSON_TYPE]: serviceAnswer } },
        304: { about: 'Unchanged.' },
      },
    }),
    handler: async (request, reply) => answerJson(request, reply, operations.service(viewerOf(request))),
  });
}
