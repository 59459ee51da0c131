/**
 * The pull: what instrument PCs ask for again and again, nearly always to hear that nothing changed. One small select
 * tells; the sheet itself follows from chip, release name, sequence and content, so that its text is made once.
 */
import type { FastifyInstance, FastifyReply, FastifyRequest } from 'fastify';
import { z } from 'zod';
import { notFound, tooManyOpen } from '../errors.ts';
import type { ReleaseHead } from '../store/store.ts';
import { releaseSheet, settingSheetCsv, settingSheetJson } from '../views/index.ts';
import { sheetAnswer } from './answers.ts';
import { CONDITIONAL_HEADERS, describe, WAIT_HEADER } from './describe.ts';
import { viewerOf } from './frame/index.ts';
import { longPoll, waitOf } from './long-poll.ts';
import { chipOf, paramOf, serialParams } from './parameters.ts';
import { matchesAny, splitSuffix } from './protocol/index.ts';
import {
  answerTagged,
  CSV_OFFER,
  JSON_OFFER,
  JSON_TYPE,
  type Offer,
  representationFor,
  TAG_HASH_DIGITS,
  tagsOf,
} from './reply.ts';
import type { RestDeps } from './rest.ts';
import { releaseTopic } from './waiting.ts';

export const RELEASES_TAG = 'Releases';
export const RELEASES_PATH = '/v1/chips/:serial/releases';
export const SHEET_OFFERS: readonly Offer[] = [JSON_OFFER, CSV_OFFER];

const pullParams = serialParams.extend({
  name: z.string().describe('Name of the release, usually `current`, optionally with `.json` or `.csv`.'),
});

/** Names release, representation and layout version: the bytes follow from these three. */
export const releaseTag = (release: Pick<ReleaseHead, 'sequence' | 'contentHash'>, suffix: string): string =>
  `"${release.sequence}.${release.contentHash.slice(0, TAG_HASH_DIGITS)}.${suffix}1"`;

/** Sheets kept as text: 2 kB to 30 kB each. */
const KEPT_SHEETS = 200;

export function registerPull(app: FastifyInstance, deps: RestDeps): void {
  const { operations } = deps;
  const sheets = new Map<string, string>();

  const headOf = (request: FastifyRequest, name: string): Promise<ReleaseHead | null> =>
    operations.findReleaseHead(viewerOf(request), paramOf(request, 'serial'), name);

  async function sheetOf(request: FastifyRequest, head: ReleaseHead, { suffix }: Offer): Promise<string> {
    const { chipId, name, sequence, contentHash } = head;
    const key = `${chipId} ${name} ${sequence} ${contentHash} ${suffix}`;
    const known = sheets.get(key);
    if (known !== undefined) return known;
    const release = await operations.findReleaseBySequence(viewerOf(request), chipId, name, sequence);
    if (!release) throw notFound(`release ${name}`);
    const sheet = releaseSheet(release);
    const text = suffix === 'csv' ? settingSheetCsv(sheet) : JSON.stringify(settingSheetJson(sheet));
    if (sheets.size >= KEPT_SHEETS) sheets.delete(sheets.keys().next().value ?? '');
    sheets.set(key, text);
    return text;
  }

  async function awaitNews(
    request: FastifyRequest,
    reply: FastifyReply,
    name: string,
    offer: Offer,
    seconds: number,
  ) {
    const known = tagsOf(request, 'if-none-match');
    // A chip that does not exist will not release anything: 404 now.
    if (!(await headOf(request, name))) await chipOf(request, operations);
    const waited = await longPoll(request, reply, deps, {
      topic: releaseTopic(paramOf(request, 'serial'), name),
      seconds,
      read: () => headOf(request, name),
      // With `*` every release is known, so that none could ever be news: answered at once.
      isSettled: (now) =>
        now !== null && (!known || known === '*' || !matchesAny(known, releaseTag(now, offer.suffix))),
    });
    if (!waited) throw tooManyOpen('long polls', operations.limits.longPolls);
    return waited.value;
  }

  app.get(`${RELEASES_PATH}/:name`, {
    config: { access: 'release.read' },
    schema: describe({
      tag: RELEASES_TAG,
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
      const { stem: name, suffix } = splitSuffix(paramOf(request, 'name'), SHEET_OFFERS);
      const offer = representationFor(request, SHEET_OFFERS, suffix);
      const seconds = waitOf(request);
      const head =
        seconds === null
          ? await headOf(request, name)
          : await awaitNews(request, reply, name, offer, seconds);
      if (!head) {
        const chip = await chipOf(request, operations);
        throw notFound(`release ${name.slice(0, 64)} of chip ${chip.serial} yet`);
      }
      return answerTagged(request, reply, {
        etag: releaseTag(head, offer.suffix),
        mediaType: offer.contentType,
        fileName: `${paramOf(request, 'serial')}.${name}.${head.sequence}.${offer.suffix}`,
        render: () => sheetOf(request, head, offer),
      });
    },
  });
}
