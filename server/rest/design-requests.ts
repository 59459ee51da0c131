/** Asking for designs: 200 from the store or within the wait, else 202 and a place to look. */
import type { FastifyInstance, FastifyReply, FastifyRequest } from 'fastify';
import { z } from 'zod';
import { requestDesignRule } from '../../schema/design-request.ts';
import { notFound, tooManyOpen } from '../errors.ts';
import type { DesignRequest } from '../operations/index.ts';
import { connectionAnswer, designAnswer, requestAnswer } from './answers.ts';
import { CONDITIONAL_HEADERS, describe, IDEMPOTENCY_HEADER, WAIT_HEADER } from './describe.ts';
import { answerDesign } from './designs.ts';
import { viewerOf, writeProblem } from './frame/index.ts';
import { longPoll, waitOf } from './long-poll.ts';
import { paramOf, writeOptionsOf } from './parameters.ts';
import { matchesAny } from './protocol/index.ts';
import { listAskOf, pageQuery, readQuery } from './query.ts';
import { answerPage, recordText } from './record-answers.ts';
import { answerTagged, JSON_TYPE, tagsOf } from './reply.ts';
import type { RestDeps } from './rest.ts';
import { computationTopic } from './waiting.ts';
import { requestsWire } from './wire.ts';

const TAG = 'Design requests';
const PATH = '/v1/design-requests';

const listQuery = z.strictObject({
  ...pageQuery,
  chip: z.string().optional().describe('Serial of the chip.'),
  state: z.string().optional().describe('One or more states, separated by commas.'),
  mine: z.enum(['true', 'false']).optional().describe("Only those of the token's own actor."),
});

const idParams = z.object({ id: z.string().describe('`req_…`') });

const isLive = (request: DesignRequest): boolean => request.state === 'QUEUED' || request.state === 'RUNNING';
const pathOf = (request: DesignRequest): string => `${PATH}/${request.id}`;
/** A request changes in nothing but these two until it ends, and in nothing at all afterwards. */
const tagOf = (request: DesignRequest): string => `"${request.state}.${request.progress}.json1"`;

/** RFC 9110 section 10.2.3; computations take from milliseconds to seconds. */
const RETRY_AFTER_SECONDS = '1';

export function registerDesignRequests(app: FastifyInstance, deps: RestDeps): void {
  const { operations } = deps;

  const find = async (request: FastifyRequest): Promise<DesignRequest> => {
    const id = paramOf(request, 'id');
    const found = await operations.findRequest(viewerOf(request), id);
    if (!found) throw notFound(`design request ${id.slice(0, 80)}`);
    return found;
  };

  const waitFor = async (
    request: FastifyRequest,
    reply: FastifyReply,
    asked: DesignRequest,
    isSettled: (now: DesignRequest) => boolean,
    seconds: number,
  ) => {
    const viewer = viewerOf(request);
    return longPoll(request, reply, deps, {
      topic: computationTopic(asked.computationId ?? asked.id),
      seconds,
      read: async () => (await operations.findRequest(viewer, asked.id)) ?? asked,
      isSettled,
    });
  };

  const answerAsked = async (
    request: FastifyRequest,
    reply: FastifyReply,
    asked: DesignRequest,
  ): Promise<FastifyReply> => {
    const location = pathOf(asked);
    reply.header('location', location);
    if (asked.state === 'DONE') {
      const design = asked.design ?? (await operations.designById(viewerOf(request), asked.designId ?? ''));
      if (!design) throw notFound(`design of ${location}`);
      return answerDesign(deps, request, reply, design);
    }
    if (asked.state === 'FAILED' && asked.problem)
      return writeProblem(reply, { ...asked.problem, instance: location });
    const body = await recordText(deps, request, requestsWire, asked);
    if (isLive(asked)) reply.code(202).header('retry-after', RETRY_AFTER_SECONDS);
    return reply.headers({ etag: tagOf(asked), 'content-type': JSON_TYPE }).send(body);
  };

  app.post(PATH, {
    config: { access: 'design.request' },
    schema: describe({
      tag: TAG,
      summary: 'Ask for a design',
      about:
        'A design that is in the store, or finished within the wait, is answered itself (200, `Content-Location`). Otherwise the request is (202, `Location`). What closed form can refuse is refused at once.',
      body: requestDesignRule,
      headers: { ...WAIT_HEADER, ...IDEMPOTENCY_HEADER },
      answers: {
        200: { about: 'The design.', content: { [JSON_TYPE]: designAnswer } },
        202: {
          about: 'The request, queued or running. `Retry-After` says when to look again.',
          content: { [JSON_TYPE]: requestAnswer },
        },
      },
      problems: [
        'NOT_FOUND',
        'TOO_LARGE',
        'UNSUPPORTED_MEDIA_TYPE',
        'STALE_CHIP_REVISION',
        'SPECIFICATION_INVALID',
        'WRONG_UNIT',
        'BANDS_COLLIDE',
        'SPECIFICATION_UNREACHABLE',
        'SETTING_UNREACHABLE',
        'IDEMPOTENCY_KEY_REUSED',
        'TOO_MANY_OPEN',
        'QUEUE_FULL',
        'COMPUTATION_CRASHED',
        'COMPUTATION_TIMED_OUT',
        'ENGINE_RETIRED',
      ],
    }),
    handler: async (request, reply) => {
      const asked = await operations.requestDesign(viewerOf(request), request.body, writeOptionsOf(request));
      const seconds = waitOf(request);
      if (seconds === null) return answerAsked(request, reply, asked);
      // With too many long polls open the answer is 202 without Preference-Applied: the request exists already.
      const waited = await waitFor(request, reply, asked, (now) => !isLive(now), seconds);
      return answerAsked(request, reply, waited?.value ?? asked);
    },
  });

  app.get(PATH, {
    config: { access: 'design-request.list' },
    schema: describe({
      tag: TAG,
      summary: 'List design requests, newest first',
      query: listQuery,
      headers: CONDITIONAL_HEADERS,
      answers: {
        200: { about: 'A page.', content: { [JSON_TYPE]: connectionAnswer(requestAnswer) } },
        304: { about: 'Unchanged.' },
      },
      problems: ['BAD_CURSOR', 'NOT_FOUND'],
    }),
    handler: async (request, reply) => {
      const { state, mine, ...query } = readQuery(request, listQuery);
      const ask = listAskOf({
        ...query,
        ...(state === undefined ? {} : { state: state.split(',') }),
        ...(mine === undefined ? {} : { mine: mine === 'true' }),
      });
      const page = await operations.listRequests(viewerOf(request), ask);
      return answerPage(deps, request, reply, page, requestsWire);
    },
  });

  app.get(`${PATH}/:id`, {
    config: { access: 'design-request.read' },
    schema: describe({
      tag: TAG,
      summary: 'Read a design request in whatever state it is',
      about:
        'With `If-None-Match` and `Prefer: wait=N` a long poll: answered when state or progress change, 304 at the end of the wait.',
      params: idParams,
      headers: { ...CONDITIONAL_HEADERS, ...WAIT_HEADER },
      answers: {
        200: { about: 'The request.', content: { [JSON_TYPE]: requestAnswer } },
        304: { about: 'Unchanged.' },
      },
      problems: ['NOT_FOUND', 'TOO_MANY_OPEN', 'PRECONDITION_FAILED'],
    }),
    handler: async (request, reply) => {
      let found = await find(request);
      const known = tagsOf(request, 'if-none-match');
      const seconds = waitOf(request);
      if (seconds !== null && known && isLive(found)) {
        const waited = await waitFor(
          request,
          reply,
          found,
          (now) => !isLive(now) || !matchesAny(known, tagOf(now)),
          seconds,
        );
        if (!waited) throw tooManyOpen('long polls', operations.limits.longPolls);
        found = waited.value;
      }
      return answerTagged(request, reply, {
        etag: tagOf(found),
        mediaType: JSON_TYPE,
        render: () => recordText(deps, request, requestsWire, found),
      });
    },
  });

  app.post(`${PATH}/:id/cancel`, {
    config: { access: 'design.cancel' },
    schema: describe({
      tag: TAG,
      summary: 'Cancel a design request',
      about: 'Ends this ask. The computation ends when its last asker has left. A repeat answers the same.',
      params: idParams,
      answers: { 200: { about: 'The cancelled request.', content: { [JSON_TYPE]: requestAnswer } } },
      problems: ['NOT_FOUND', 'ALREADY_FINISHED'],
    }),
    handler: async (request, reply) => {
      const viewer = viewerOf(request);
      const cancelled = await operations.cancelDesignRequest(viewer, { id: paramOf(request, 'id') });
      const body = await recordText(deps, request, requestsWire, cancelled);
      return reply.headers({ etag: tagOf(cancelled), 'content-type': JSON_TYPE }).send(body);
    },
  });
}
