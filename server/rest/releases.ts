/** Releases: what instruments pull, and how people publish. */
import type { FastifyInstance, FastifyRequest } from 'fastify';
import { z } from 'zod';
import { badInput } from '../errors.ts';
import type { ReleaseRecord } from '../store/records.ts';
import type { ReleaseHead } from '../store/store.ts';
import { connectionAnswer, publishBody, releaseAnswer, releasesAnswer } from './answers.ts';
import { CONDITIONAL_HEADERS, describe, IDEMPOTENCY_HEADER } from './describe.ts';
import { viewerOf } from './frame/index.ts';
import { chipOf, paramOf, serialParams, writeOptionsOf } from './parameters.ts';
import { expectationOf, expectedNumber, withPresentTag } from './preconditions.ts';
import { splitSuffix } from './protocol/index.ts';
import { RELEASES_PATH, RELEASES_TAG, releaseTag, SHEET_OFFERS } from './pull.ts';
import { listAskOf, pageQuery, readQuery, withMembers } from './query.ts';
import { answerPage, recordText } from './record-answers.ts';
import { answerJson, answerWritten, JSON_TYPE } from './reply.ts';
import { type RestDeps, wiringOf } from './rest.ts';
import { releasesWire } from './wire.ts';

const pageOnly = z.strictObject(pageQuery);
const nameParams = serialParams.extend({
  name: z.string().describe('Name of the release, usually `current`.'),
});
const tagOf = ({ sequence, version }: ReleaseRecord, suffix: string): string =>
  releaseTag({ sequence, contentHash: version.contentHash }, suffix);

export function registerReleases(app: FastifyInstance, deps: RestDeps): void {
  const { operations } = deps;

  app.get(RELEASES_PATH, {
    config: { access: 'release.read' },
    schema: describe({
      tag: RELEASES_TAG,
      summary: 'Every release name of a chip and what it points at',
      params: serialParams,
      headers: CONDITIONAL_HEADERS,
      answers: {
        200: { about: 'All of them.', content: { [JSON_TYPE]: releasesAnswer } },
        304: { about: 'Unchanged.' },
      },
      problems: ['NOT_FOUND'],
    }),
    handler: async (request, reply) => {
      const viewer = viewerOf(request);
      const releases = await operations.listReleases(viewer, await chipOf(request, operations));
      return answerJson(request, reply, { releases: await releasesWire(wiringOf(deps, request), releases) });
    },
  });

  app.get(`${RELEASES_PATH}/:name/log`, {
    config: { access: 'release.read' },
    schema: describe({
      tag: RELEASES_TAG,
      summary: 'Everything a release name ever pointed at, newest first',
      params: nameParams,
      query: pageOnly,
      headers: CONDITIONAL_HEADERS,
      answers: {
        200: { about: 'A page.', content: { [JSON_TYPE]: connectionAnswer(releaseAnswer) } },
        304: { about: 'Unchanged.' },
      },
      problems: ['BAD_CURSOR', 'NOT_FOUND'],
    }),
    handler: async (request, reply) => {
      const viewer = viewerOf(request);
      const chip = await chipOf(request, operations);
      const ask = listAskOf(readQuery(request, pageOnly));
      const page = await operations.listReleaseLog(viewer, chip, paramOf(request, 'name'), ask);
      return answerPage(deps, request, reply, page, releasesWire);
    },
  });

  app.put(`${RELEASES_PATH}/:name`, {
    config: { access: 'release.publish' },
    schema: describe({
      tag: RELEASES_TAG,
      summary: 'Publish a version',
      about:
        'Points the release name at a version; going back is publishing an older version. Cautions of the version (a mask that is missed, an older chip revision) must be named in `accept`. `If-Match` publishes only over the release whose tag is given, `If-None-Match: *` only the first.',
      params: nameParams,
      body: publishBody,
      headers: {
        'if-match': 'Tag of the release that is replaced, of any representation.',
        'if-none-match': '`*`: only the first.',
        ...IDEMPOTENCY_HEADER,
      },
      answers: {
        200: { about: 'Published.', content: { [JSON_TYPE]: releaseAnswer } },
        201: { about: 'Published, the first of this name.', content: { [JSON_TYPE]: releaseAnswer } },
      },
      problems: [
        'NOT_FOUND',
        'TOO_LARGE',
        'UNSUPPORTED_MEDIA_TYPE',
        'STALE_CHIP_REVISION',
        'CAUTION_NOT_ACCEPTED',
        'PRECONDITION_FAILED',
        'IDEMPOTENCY_KEY_REUSED',
      ],
    }),
    handler: async (request, reply) => {
      const viewer = viewerOf(request);
      const name = paramOf(request, 'name');
      if (splitSuffix(name, SHEET_OFFERS).suffix !== null) {
        throw badInput(
          'A release name must not end in .json or .csv: the pull could not tell it from a representation.',
          {
            pointer: '/name',
            given: name.slice(0, 80),
          },
        );
      }
      const chip = await chipOf(request, operations);
      const options = writeOptionsOf(request);
      const expectedSequence = await expectedSequenceOf(request, options.idempotencyKey !== undefined);
      const body = withMembers(request.body, { chip: chip.serial, name, expectedSequence });
      const { record, replayed } = await withPresentTag(
        () => operations.publishRelease(viewer, body, options),
        async () => {
          const present = await headOf(request);
          return present ? releaseTag(present, 'json') : null;
        },
      );
      const location = `/v1/chips/${chip.serial}/releases/${record.name}`;
      const wire = await recordText(deps, request, releasesWire, record);
      return answerWritten(reply, record.sequence === 1 && !replayed, location, tagOf(record, 'json'), wire);
    },
  });

  const headOf = (request: FastifyRequest): Promise<ReleaseHead | null> =>
    operations.findReleaseHead(viewerOf(request), paramOf(request, 'serial'), paramOf(request, 'name'));

  async function expectedSequenceOf(
    request: FastifyRequest,
    mayBeRepeat: boolean,
  ): Promise<number | undefined> {
    const { kind, tags } = expectationOf(request);
    if (kind === 'NONE') return undefined;
    if (kind === 'NEW') return 0;
    const present = await headOf(request);
    const presentTags = present ? SHEET_OFFERS.map((offer) => releaseTag(present, offer.suffix)) : [];
    return expectedNumber(tags ?? [], { number: present?.sequence ?? 0, tags: presentTags }, mayBeRepeat);
  }
}
