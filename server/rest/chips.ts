/** Chips and their model revisions. */
import type { FastifyInstance, FastifyRequest } from 'fastify';
import { z } from 'zod';
import { notFound, ProblemError, refuse } from '../errors.ts';
import type { ChipRecord, ChipRevisionRecord } from '../store/records.ts';
import { chipAnswer, connectionAnswer, putChipRule, revisionAnswer } from './answers.ts';
import { CONDITIONAL_HEADERS, describe, IDEMPOTENCY_HEADER } from './describe.ts';
import { viewerOf } from './frame/index.ts';
import { chipOf, numberOf, paramOf, serialParams, writeOptionsOf } from './parameters.ts';
import { expectationOf, expectedNumber, withPresentTag } from './preconditions.ts';
import { listAskOf, pageQuery, readQuery, withMembers } from './query.ts';
import { answerPage, recordText } from './record-answers.ts';
import { answerTagged, answerWritten, JSON_TYPE, preconditionFailed, TAG_HASH_DIGITS } from './reply.ts';
import type { RestDeps } from './rest.ts';
import { chipsWire, revisionsWire } from './wire.ts';

const TAG = 'Chips';
const PATH = '/v1/chips';
const pageOnly = z.strictObject(pageQuery);
const revisionParams = serialParams.extend({
  number: z.string().describe('Number of the revision, from 1.'),
});

/** A chip is its head revision: nothing else about it can change. */
const tagOf = (revision: ChipRevisionRecord): string =>
  `"${revision.number}.${revision.hash.slice(0, TAG_HASH_DIGITS)}.json1"`;

export function registerChips(app: FastifyInstance, deps: RestDeps): void {
  const { operations } = deps;

  app.get(PATH, {
    config: { access: 'chip.read' },
    schema: describe({
      tag: TAG,
      summary: 'List chips',
      query: pageOnly,
      headers: CONDITIONAL_HEADERS,
      answers: {
        200: { about: 'A page.', content: { [JSON_TYPE]: connectionAnswer(chipAnswer) } },
        304: { about: 'Unchanged.' },
      },
      problems: ['BAD_CURSOR'],
    }),
    handler: async (request, reply) => {
      const page = await operations.listChips(viewerOf(request), listAskOf(readQuery(request, pageOnly)));
      return answerPage(deps, request, reply, page, chipsWire);
    },
  });

  app.get(`${PATH}/:serial`, {
    config: { access: 'chip.read' },
    schema: describe({
      tag: TAG,
      summary: 'Read a chip with its present model',
      params: serialParams,
      headers: CONDITIONAL_HEADERS,
      answers: {
        200: { about: 'The chip.', content: { [JSON_TYPE]: chipAnswer } },
        304: { about: 'Unchanged.' },
      },
      problems: ['NOT_FOUND', 'PRECONDITION_FAILED'],
    }),
    handler: async (request, reply) => {
      const viewer = viewerOf(request);
      const chip = await chipOf(request, operations);
      const head = await operations.headRevision(viewer, chip);
      return answerTagged(request, reply, {
        etag: tagOf(head),
        mediaType: JSON_TYPE,
        render: () => recordText(deps, request, chipsWire, chip),
      });
    },
  });

  app.put(`${PATH}/:serial`, {
    config: { access: 'chip.register' },
    schema: describe({
      tag: TAG,
      summary: 'Register or revise a chip',
      about:
        '`If-None-Match: *` registers (201). `If-Match` with the tag of the head revision revises (200); the same content answers the same revision. Neither: 428.',
      params: serialParams,
      body: putChipRule,
      headers: {
        'if-match': 'Tag of the revision that is replaced.',
        'if-none-match': '`*`: register.',
        ...IDEMPOTENCY_HEADER,
      },
      answers: {
        200: { about: 'Revised.', content: { [JSON_TYPE]: chipAnswer } },
        201: { about: 'Registered.', content: { [JSON_TYPE]: chipAnswer } },
      },
      problems: [
        'TOO_LARGE',
        'UNSUPPORTED_MEDIA_TYPE',
        'PRECONDITION_FAILED',
        'PRECONDITION_REQUIRED',
        'WRONG_UNIT',
        'IDEMPOTENCY_KEY_REUSED',
      ],
    }),
    handler: async (request, reply) => {
      const { kind, tags } = expectationOf(request);
      if (kind === 'NONE') {
        throw refuse(
          'PRECONDITION_REQUIRED',
          'Send If-None-Match: * to register, or If-Match with the tag of the revision that was read to revise.',
        );
      }
      const created = kind === 'NEW' && (await register(request));
      if (kind === 'MATCH') await revise(request, tags ?? []);
      const chip = await chipOf(request, operations);
      const head = await operations.headRevision(viewerOf(request), chip);
      const wire = await recordText(deps, request, chipsWire, chip);
      return answerWritten(reply, created, `${PATH}/${chip.serial}`, tagOf(head), wire);
    },
  });

  app.get(`${PATH}/:serial/revisions`, {
    config: { access: 'chip.read' },
    schema: describe({
      tag: TAG,
      summary: 'List the model revisions of a chip',
      params: serialParams,
      query: pageOnly,
      headers: CONDITIONAL_HEADERS,
      answers: {
        200: { about: 'A page.', content: { [JSON_TYPE]: connectionAnswer(revisionAnswer) } },
        304: { about: 'Unchanged.' },
      },
      problems: ['BAD_CURSOR', 'NOT_FOUND'],
    }),
    handler: async (request, reply) => {
      const chip = await chipOf(request, operations);
      const page = await operations.listRevisions(
        viewerOf(request),
        chip,
        listAskOf(readQuery(request, pageOnly)),
      );
      return answerPage(deps, request, reply, page, revisionsWire);
    },
  });

  app.get(`${PATH}/:serial/revisions/:number`, {
    config: { access: 'chip.read' },
    schema: describe({
      tag: TAG,
      summary: 'Read one model revision',
      params: revisionParams,
      headers: CONDITIONAL_HEADERS,
      answers: {
        200: { about: 'The revision.', content: { [JSON_TYPE]: revisionAnswer } },
        304: { about: 'Unchanged.' },
      },
      problems: ['NOT_FOUND', 'PRECONDITION_FAILED'],
    }),
    handler: async (request, reply) => {
      const viewer = viewerOf(request);
      const chip = await chipOf(request, operations);
      const number = numberOf(paramOf(request, 'number'));
      const revision = number === null ? null : await operations.findRevision(viewer, chip, number);
      if (!revision)
        throw notFound(`revision ${paramOf(request, 'number').slice(0, 20)} of chip ${chip.serial}`);
      return answerTagged(request, reply, {
        etag: tagOf(revision),
        mediaType: JSON_TYPE,
        render: () => recordText(deps, request, revisionsWire, revision),
      });
    },
  });

  const headTag = async (request: FastifyRequest): Promise<string | null> => {
    const chip = await operations.findChip(viewerOf(request), paramOf(request, 'serial'));
    return chip ? tagOf(await operations.headRevision(viewerOf(request), chip)) : null;
  };

  /** True: made now. */
  async function register(request: FastifyRequest): Promise<boolean> {
    const body = withMembers(request.body, { serial: paramOf(request, 'serial') });
    try {
      return !(await operations.registerChip(viewerOf(request), body, writeOptionsOf(request))).replayed;
    } catch (error) {
      // The serial exists: in terms of the request, If-None-Match: * failed.
      if (!(error instanceof ProblemError) || error.problem.code !== 'NAME_TAKEN') throw error;
      throw preconditionFailed(await headTag(request));
    }
  }

  async function revise(request: FastifyRequest, tags: Parameters<typeof expectedNumber>[0]): Promise<void> {
    const viewer = viewerOf(request);
    const options = writeOptionsOf(request);
    const serial = paramOf(request, 'serial');
    const chip: ChipRecord | null = await operations.findChip(viewer, serial);
    if (!chip) throw preconditionFailed(null);
    const head = await operations.headRevision(viewer, chip);
    const present = { number: head.number, tags: [tagOf(head)] };
    const expectedRevision = expectedNumber(tags, present, options.idempotencyKey !== undefined);
    const body = withMembers(request.body, { chip: serial, expectedRevision });
    await withPresentTag(
      () => operations.reviseChip(viewer, body, options),
      () => headTag(request),
    );
  }
}
