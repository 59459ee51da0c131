/** Finished designs: read, search, and everything that is evaluated from one. */
import type { FastifyInstance, FastifyReply, FastifyRequest } from 'fastify';
import { z } from 'zod';
import { notFound } from '../errors.ts';
import type { DesignRecord } from '../store/records.ts';
import { designSheet, settingSheetCsv, settingSheetJson } from '../views/index.ts';
import { connectionAnswer, designAnswer, netlistAnswer, sheetAnswer } from './answers.ts';
import { CONDITIONAL_HEADERS, describe } from './describe.ts';
import { viewerOf } from './frame/index.ts';
import { paramOf } from './parameters.ts';
import { booleanQuery, listAskOf, numberQuery, pageQuery, readQuery } from './query.ts';
import { answerPage, recordText } from './record-answers.ts';
import {
  answerTagged,
  CSV_OFFER,
  JSON_OFFER,
  JSON_TYPE,
  representationFor,
  TAG_HASH_DIGITS,
} from './reply.ts';
import type { RestDeps } from './rest.ts';
import { designsWire } from './wire.ts';

export const DESIGNS_TAG = 'Designs';
export const DESIGNS_PATH = '/v1/designs';

export const designParams = z.object({ id: z.string().describe('`dsn_` and the SHA-256 of its question.') });

const listQuery = z.strictObject({
  ...pageQuery,
  chip: z.string().optional().describe('Serial of the chip.'),
  family: z.string().optional(),
  architecture: z.string().optional(),
  met: booleanQuery.optional().describe('Whether every band of the mask is met.'),
  minRejectionDb: numberQuery.optional(),
  maxInsertionLossDb: numberQuery.optional(),
  createdAfter: z.string().optional().describe('RFC 3339.'),
  createdBefore: z.string().optional().describe('RFC 3339.'),
  order: z.enum(['NEWEST', 'REJECTION']).optional(),
});

/** A design never changes, so that its answer's digits name every representation of it. */
export const designTag = (design: DesignRecord, representation: string): string =>
  `"${design.resultHash.slice(0, TAG_HASH_DIGITS)}.${representation}"`;

export async function findDesign(request: FastifyRequest, { operations }: RestDeps): Promise<DesignRecord> {
  const id = paramOf(request, 'id');
  const design = await operations.findDesign(viewerOf(request), id);
  if (!design) throw notFound(`design ${id.slice(0, 80)}`);
  return design;
}

/** Texts kept: about 30 kB each. The same design is asked for again and again while a script polls or a lab compares. */
const KEPT_TEXTS = 200;

/** A design never changes, and who may not see it never comes here: its text is made, and encoded, once. */
async function designText(deps: RestDeps, request: FastifyRequest, design: DesignRecord): Promise<Buffer> {
  const { designTexts: texts } = deps;
  const known = texts.get(design.id);
  if (known !== undefined) return known;
  const text = Buffer.from(await recordText(deps, request, designsWire, design), 'utf8');
  if (texts.size >= KEPT_TEXTS) texts.delete(texts.keys().next().value ?? '');
  texts.set(design.id, text);
  return text;
}

/** The design as the answer to a request for it. */
export async function answerDesign(
  deps: RestDeps,
  request: FastifyRequest,
  reply: FastifyReply,
  design: DesignRecord,
): Promise<FastifyReply> {
  return reply
    .headers({
      'content-location': `${DESIGNS_PATH}/dsn_${design.id}`,
      etag: designTag(design, 'json1'),
      'content-type': JSON_TYPE,
    })
    .send(await designText(deps, request, design));
}

export function registerDesigns(app: FastifyInstance, deps: RestDeps): void {
  const { operations } = deps;

  app.get(DESIGNS_PATH, {
    config: { access: 'design.list' },
    schema: describe({
      tag: DESIGNS_TAG,
      summary: 'Search designs',
      query: listQuery,
      headers: CONDITIONAL_HEADERS,
      answers: {
        200: { about: 'A page.', content: { [JSON_TYPE]: connectionAnswer(designAnswer) } },
        304: { about: 'Unchanged.' },
      },
      problems: ['BAD_CURSOR', 'NOT_FOUND'],
    }),
    handler: async (request, reply) => {
      const page = await operations.listDesigns(viewerOf(request), listAskOf(readQuery(request, listQuery)));
      return answerPage(deps, request, reply, page, designsWire);
    },
  });

  app.get(`${DESIGNS_PATH}/:id`, {
    config: { access: 'design.read' },
    schema: describe({
      tag: DESIGNS_TAG,
      summary: 'Read a design',
      params: designParams,
      headers: CONDITIONAL_HEADERS,
      answers: {
        200: { about: 'The design, curves apart.', content: { [JSON_TYPE]: designAnswer } },
        304: { about: 'Unchanged: a design never changes.' },
      },
      problems: ['NOT_FOUND', 'PRECONDITION_FAILED'],
    }),
    handler: async (request, reply) => {
      const design = await findDesign(request, deps);
      return answerTagged(request, reply, {
        etag: designTag(design, 'json1'),
        mediaType: JSON_TYPE,
        render: () => designText(deps, request, design),
      });
    },
  });

  const settingOffers = [JSON_OFFER, CSV_OFFER];
  for (const suffix of [null, 'json', 'csv'] as const) {
    const offered = settingOffers.filter((offer) => suffix === null || offer.suffix === suffix);
    app.get(`${DESIGNS_PATH}/:id/setting${suffix === null ? '' : `.${suffix}`}`, {
      config: { access: 'design.read' },
      schema: describe({
        tag: DESIGNS_TAG,
        summary: 'The setting sheet of a design',
        about:
          'Every driver channel of the chip, unused ones at 0 mA. A sheet of a design is not released: check it against the data sheet of the chip and the driver before use.',
        params: designParams,
        headers: CONDITIONAL_HEADERS,
        answers: {
          200: {
            about: 'The sheet.',
            content: Object.fromEntries(
              offered.map((offer) => [offer.mediaType, offer.suffix === 'csv' ? z.string() : sheetAnswer]),
            ),
          },
          304: { about: 'Unchanged.' },
        },
        problems: ['NOT_FOUND', 'NOT_ACCEPTABLE', 'PRECONDITION_FAILED'],
      }),
      handler: async (request, reply) => {
        const offer = representationFor(request, offered, suffix);
        const design = await findDesign(request, deps);
        const sheet = await sheetOf(request, design);
        return answerTagged(request, reply, {
          etag: designTag(design, `${offer.suffix}1`),
          mediaType: offer.contentType,
          fileName: `dsn_${design.id.slice(0, TAG_HASH_DIGITS)}.setting.${offer.suffix}`,
          render: () =>
            offer.suffix === 'csv' ? settingSheetCsv(sheet) : JSON.stringify(settingSheetJson(sheet)),
        });
      },
    });
  }

  app.get(`${DESIGNS_PATH}/:id/netlist.json`, {
    config: { access: 'design.read' },
    schema: describe({
      tag: DESIGNS_TAG,
      summary: 'The lossless circuit as a netlist',
      params: designParams,
      headers: CONDITIONAL_HEADERS,
      answers: {
        200: { about: 'Elements, connections and ports.', content: { [JSON_TYPE]: netlistAnswer } },
        304: { about: 'Unchanged.' },
      },
      problems: ['NOT_FOUND', 'PRECONDITION_FAILED'],
    }),
    handler: async (request, reply) => {
      const design = await findDesign(request, deps);
      return answerTagged(request, reply, {
        etag: designTag(design, 'netlist1'),
        mediaType: JSON_TYPE,
        fileName: `dsn_${design.id.slice(0, TAG_HASH_DIGITS)}.netlist.json`,
        render: async () => JSON.stringify(await operations.designNetlist(viewerOf(request), design)),
      });
    },
  });

  async function sheetOf(request: FastifyRequest, design: DesignRecord) {
    const viewer = viewerOf(request);
    const [chip, revision] = await Promise.all([
      operations.chipById(viewer, design.chipId),
      operations.revisionById(viewer, design.chipRevisionId),
    ]);
    if (!chip || !revision) throw notFound(`chip of design dsn_${design.id}`);
    return designSheet(design, chip, revision);
  }
}
