/** Whether a specification could be met, by closed form alone: no row, no job. */
import type { FastifyInstance } from 'fastify';
import { requestDesignRule } from '../../schema/design-request.ts';
import { checkAnswer } from './answers.ts';
import { describe } from './describe.ts';
import { viewerOf } from './frame/index.ts';
import { JSON_TYPE } from './reply.ts';
import type { RestDeps } from './rest.ts';
import { checkWire } from './wire.ts';

export function registerSpecificationChecks(app: FastifyInstance, { operations }: RestDeps): void {
  app.post('/v1/specification-checks', {
    config: { access: 'specification.check' },
    schema: describe({
      tag: 'Design requests',
      summary: 'Check a specification against a chip',
      about: 'A refusal is an answer here: `ok` is false and `problem` says why and what would work.',
      body: requestDesignRule,
      answers: { 200: { about: 'What closed form says.', content: { [JSON_TYPE]: checkAnswer } } },
      problems: ['NOT_FOUND', 'TOO_LARGE', 'UNSUPPORTED_MEDIA_TYPE'],
    }),
    handler: async (request, reply) => {
      const check = await operations.checkSpecification(viewerOf(request), request.body);
      return reply.header('content-type', JSON_TYPE).send(JSON.stringify(checkWire(operations, check)));
    },
  });
}
