/** Who did what when. */
import type { FastifyInstance } from 'fastify';
import { z } from 'zod';
import { connectionAnswer, historyAnswer } from './answers.ts';
import { CONDITIONAL_HEADERS, describe } from './describe.ts';
import { viewerOf } from './frame/index.ts';
import { pageQuery, readQuery } from './query.ts';
import { answerPage } from './record-answers.ts';
import { JSON_TYPE } from './reply.ts';
import type { RestDeps } from './rest.ts';
import { historyWire } from './wire.ts';

const listQuery = z.strictObject({
  ...pageQuery,
  chip: z.string().optional().describe('Serial of the chip.'),
  actor: z.string().optional().describe('Id of the actor.'),
  action: z.string().optional(),
  since: z.string().optional().describe('RFC 3339: entries after that time.'),
  until: z.string().optional().describe('RFC 3339: entries before that time.'),
});

export function registerHistory(app: FastifyInstance, deps: RestDeps): void {
  const { operations } = deps;

  app.get('/v1/history', {
    config: { access: 'history.read' },
    schema: describe({
      tag: 'Service',
      summary: 'The history, newest first',
      query: listQuery,
      headers: CONDITIONAL_HEADERS,
      answers: {
        200: { about: 'A page.', content: { [JSON_TYPE]: connectionAnswer(historyAnswer) } },
        304: { about: 'Unchanged.' },
      },
      problems: ['BAD_CURSOR', 'NOT_FOUND'],
    }),
    handler: async (request, reply) => {
      const viewer = viewerOf(request);
      const { first, after, since, until, ...filter } = readQuery(request, listQuery);
      // The operation calls the two times after and before; in a query `after` is the cursor, as in every list.
      const times = {
        ...(since === undefined ? {} : { after: since }),
        ...(until === undefined ? {} : { before: until }),
      };
      const page = await operations.listHistory(viewer, { first, after, filter: { ...filter, ...times } });
      return answerPage(deps, request, reply, page, historyWire);
    },
  });
}
