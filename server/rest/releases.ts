/** Releases: what instruments pull, and how people publish. */
import type { FastifyInstance, FastifyRequest } from 'fastify';
import { z } from 'zod';
import { NAME_PATTERN } from '../../schema/text.ts';
import { badInput, notFound, tooManyOpen } from '../errors.ts';
import type { ReleaseRecord } from '../store/records.ts';
import { releaseSheet, settingSheetCsv, settingSheetJson } from '../views/index.ts';
import { connectionAnswer, publishBody, releaseAnswer, releasesAnswer, sheetAnswer } from './answers.ts';
import { CONDITIONAL_HEADERS, describe, IDEMPOTENCY_HEADER, WAIT_HEADER } from './describe.ts';
import { viewerOf } from './frame/index.ts';
import { longPoll, waitOf } from './long-poll.ts';
import { chipOf, paramOf, serialParams, writeOptionsOf } from './parameters.ts';
import { expectationOf, expectedNumber, withPresentTag } from './preconditions.ts';
import { matchesAny, splitSuffix } from './protocol/index.ts';
import { listAskOf, pageQuery, readQuery, withMembers } from './query.ts';
import { answerPage, recordText } from './record-answers.ts';
import {
  answerJson,
  answerTagged,
  answerWritten,
  CSV_OFFER,
  JSON_OFFER,
  JSON_TYPE,
  representationFor,
  TAG_HASH_DIGITS,
  tagsOf,
} from './reply.ts';
import { type RestDeps, wiringOf } from './rest.ts';
import { releaseTopic } from './waiting.ts';
import { releasesWire } from './wire.ts';

const TAG = 'Releases';
const PATH = '/v1/chips/:serial/releases';
const pageOnly = z.strictObject(pageQuery);
const nameParams = serialParams.extend({
  name: z.string().describe('Name of the release, usually `current`.'),
});
const pullParams = serialParams.extend({
  name: z.string().describe('Name of the release, usually `current`, optionally with `.json` or `.csv`.'),
});
const OFFERS = [JSON_OFFER, CSV_OFFER];

/** Names release, representation and layout version: the bytes follow from these three. */
const tagOf = (release: ReleaseRecord, suffix: string): string =>
  `"${release.sequence}.${release.version.contentHash.slice(0, TAG_HASH_DIGITS)}.${suffix}1"`;

export function registerReleases(app: FastifyInstance, deps: RestDeps): void {
  const { operations } = deps;

  app.get(PATH, {
    config: { access: 'release.read' },
    schema: describe({
      tag: TAG,
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

  app.get(`${PATH}/:name/log`, {
    config: { access: 'release.read' },
    schema: describe({
      tag: TAG,
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

  app.get(`${PATH}/:name`, {
    config: { access: 'release.read' },
    schema: describe({
      tag: TAG,
      summary: 'Pull the released setting sheet',
      about:
        'Every driver channel of the chip, unused ones at 0 mA: a channel that is not set keeps its last current. With `Prefer: wait=N` the answer waits for the next release than the one named in `If-None-Match`, or for the first one. Light in the chip may be invisible and harmful, and hot chips are damaged by too much current: what is set is the responsibility of whoever runs the bench, under the rules of the laser safety officer and the data sheet of the chip.',
      params: pullParams,
      headers: { ...CONDITIONAL_HEADERS, ...WAIT_HEADER },
      answers: {
        200: { about: 'The sheet.', content: { [JSON_TYPE]: sheetAnswer, 'text/csv': z.string() } },
        304: { about: 'Unchanged.' },
      },
      problems: ['NOT_FOUND', 'NOT_ACCEPTABLE', 'PRECONDITION_FAILED', 'TOO_MANY_OPEN'],
    }),
    handler: async (request, reply) => {
      const { stem: name, suffix } = splitSuffix(paramOf(request, 'name'), OFFERS);
      const offer = representationFor(request, OFFERS, suffix);
      const seconds = waitOf(request);
      const release =
        seconds === null ? await find(request, name) : await awaitNews(request, name, offer.suffix, seconds);
      if (!release) {
        const chip = await chipOf(request, operations);
        throw notFound(`release ${name.slice(0, 64)} of chip ${chip.serial} yet`);
      }
      return answerTagged(request, reply, {
        etag: tagOf(release, offer.suffix),
        mediaType: offer.contentType,
        fileName: `${release.chipSerial}.${release.name}.${release.sequence}.${offer.suffix}`,
        render: () => {
          const sheet = releaseSheet(release);
          return offer.suffix === 'csv' ? settingSheetCsv(sheet) : JSON.stringify(settingSheetJson(sheet));
        },
      });

      async function awaitNews(asked: FastifyRequest, wanted: string, representation: string, wait: number) {
        const known = tagsOf(asked, 'if-none-match');
        // A chip that does not exist will not release anything: 404 now.
        const first = await find(asked, wanted);
        if (!first) await chipOf(asked, operations);
        const waited = await longPoll(asked, reply, deps, {
          topic: releaseTopic(paramOf(asked, 'serial'), wanted),
          seconds: wait,
          read: () => find(asked, wanted),
          // With `*` every release is known, so that none could ever be news: answered at once.
          isSettled: (now) =>
            now !== null && (!known || known === '*' || !matchesAny(known, tagOf(now, representation))),
        });
        if (!waited) throw tooManyOpen('long polls', operations.limits.longPolls);
        return waited.value;
      }
    },
  });

  app.put(`${PATH}/:name`, {
    config: { access: 'release.publish' },
    schema: describe({
      tag: TAG,
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
      if (splitSuffix(name, OFFERS).suffix !== null) {
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
          const present = await find(request, name);
          return present ? tagOf(present, 'json') : null;
        },
      );
      const location = `/v1/chips/${chip.serial}/releases/${record.name}`;
      const wire = await recordText(deps, request, releasesWire, record);
      return answerWritten(reply, record.sequence === 1 && !replayed, location, tagOf(record, 'json'), wire);
    },
  });

  /** What can be no name has never been published. */
  async function find(request: FastifyRequest, name: string): Promise<ReleaseRecord | null> {
    const serial = paramOf(request, 'serial');
    if (!NAME_PATTERN.test(name) || !NAME_PATTERN.test(serial)) return null;
    return operations.findRelease(viewerOf(request), serial, name);
  }

  async function expectedSequenceOf(
    request: FastifyRequest,
    mayBeRepeat: boolean,
  ): Promise<number | undefined> {
    const { kind, tags } = expectationOf(request);
    if (kind === 'NONE') return undefined;
    if (kind === 'NEW') return 0;
    const present = await find(request, paramOf(request, 'name'));
    const presentTags = present ? OFFERS.map((offer) => tagOf(present, offer.suffix)) : [];
    return expectedNumber(tags ?? [], { number: present?.sequence ?? 0, tags: presentTags }, mayBeRepeat);
  }
}
