/** Curves and plots of a design: evaluated for the question, never stored. */

import { createHash } from 'node:crypto';
import type { FastifyInstance, FastifyRequest } from 'fastify';
import { z } from 'zod';
import { LIMITS } from '../../schema/limits.ts';
import type { IntervalGhz } from '../../src/filter/index.ts';
import { badInput, notFound, ProblemError, refuse } from '../errors.ts';
import type { Curve } from '../operations/index.ts';
import { groupDelayPlot, poleZeroPlot, transmissionPlot } from '../plots/index.ts';
import type { DesignRecord } from '../store/records.ts';
import { responseCsv, responseJson, touchstone } from '../views/index.ts';
import { curveAnswer } from './answers.ts';
import { CONDITIONAL_HEADERS, describe } from './describe.ts';
import { DESIGNS_PATH, DESIGNS_TAG, designParams, designTag, findDesign } from './designs.ts';
import { viewerOf } from './frame/index.ts';
import { numberQuery, readQuery } from './query.ts';
import {
  answerTagged,
  CSV_OFFER,
  JSON_OFFER,
  type Offer,
  representationFor,
  TAG_HASH_DIGITS,
} from './reply.ts';
import type { RestDeps } from './rest.ts';

const S2P_OFFER: Offer = {
  suffix: 's2p',
  mediaType: 'text/plain',
  contentType: 'text/plain; charset=us-ascii',
};
const OFFERS = [JSON_OFFER, CSV_OFFER, S2P_OFFER];

const UNITS = ['frequencyThz', 'wavelengthNm', 'offsetGhz', 'offsetFsr'] as const;

/** Points of a grid whose query gives none. */
const DEFAULT_POINTS = 2001;

const curveQuery = z.strictObject({
  output: z.enum(['OUT1', 'OUT2']).optional(),
  stage: z.enum(['TARGET', 'CIRCUIT', 'CHIP', 'SETTING']).optional(),
  unit: z.enum(UNITS).optional().describe('Unit of `start` and `stop`; offsetGhz when absent.'),
  start: numberQuery.optional(),
  stop: numberQuery.optional(),
  points: numberQuery.optional().describe(`At most ${LIMITS.gridPoints}; ${DEFAULT_POINTS} when absent.`),
  reduceTo: numberQuery
    .optional()
    .describe('Least and greatest of so many buckets of the grid, so that notches survive.'),
});

type CurveQuery = z.output<typeof curveQuery>;

function curveAskOf({ output, stage, unit, start, stop, points, reduceTo }: CurveQuery) {
  const hasSpan = start !== undefined && stop !== undefined;
  if ((start === undefined) !== (stop === undefined)) {
    throw badInput('start and stop go together.', { pointer: start === undefined ? '/start' : '/stop' });
  }
  if (points !== undefined && points > LIMITS.gridPoints) {
    throw refuse(
      'SPECIFICATION_INVALID',
      `A curve has at most ${LIMITS.gridPoints} points; reduceTo thins a fine grid out.`,
      {
        pointer: '/points',
        given: points,
        allowed: { max: LIMITS.gridPoints },
        limit: 'GRID_POINTS',
      },
    );
  }
  if (!hasSpan && unit !== undefined)
    throw badInput('unit says what start and stop mean; give them too.', { pointer: '/start' });
  const grid = hasSpan
    ? { [unit ?? 'offsetGhz']: { start, stop, points: points ?? DEFAULT_POINTS } }
    : points === undefined
      ? undefined
      : { offsetFsr: { start: -0.5, stop: 0.5, points } };
  return {
    ...(output ? { output } : {}),
    ...(stage ? { stage } : {}),
    ...(grid ? { grid } : {}),
    ...(reduceTo === undefined ? {} : { reduceTo }),
  };
}

/** What the operation calls `/grid/<unit>/points`, the query calls `points`. */
function inQueryTerms(error: unknown): unknown {
  if (!(error instanceof ProblemError)) return error;
  const renamed = (pointer: string): string =>
    pointer.replace(/^\/grid\/\w+$/, '/unit').replace(/^\/grid\/\w+/, '');
  const said = (detail: string): string =>
    detail.replace(/\/grid\/\w+\/(\w+)/g, '/$1').replace(/\/grid\/\w+/g, 'The grid');
  const { pointer, errors, detail, ...problem } = error.problem;
  return new ProblemError(
    {
      ...problem,
      detail: said(detail),
      ...(pointer === undefined ? {} : { pointer: renamed(pointer) }),
      errors: errors.map((field) => ({
        ...field,
        pointer: renamed(field.pointer),
        detail: said(field.detail),
      })),
      // A whole input of the operation is no query that could be sent.
      nearest: [],
    },
    error.headers,
  );
}

/** Distinguishes curves of one design; the query in canonical order. */
function queryHash(ask: object): string {
  return createHash('sha256').update(JSON.stringify(ask)).digest('hex').slice(0, TAG_HASH_DIGITS);
}

/** The response repeats every FSR, and so do its bands. */
function isWithin(offsetGhz: number, band: IntervalGhz, fsrGhz: number): boolean {
  const turns = Math.ceil((band.lowGhz - offsetGhz) / fsrGhz);
  return offsetGhz + turns * fsrGhz <= band.highGhz;
}

export function registerCurves(app: FastifyInstance, deps: RestDeps): void {
  const { operations } = deps;

  const curveOf = async (request: FastifyRequest, design: DesignRecord, ask: object): Promise<Curve> => {
    try {
      return await operations.designCurve(viewerOf(request), design, ask);
    } catch (error) {
      throw inQueryTerms(error);
    }
  };

  const partsOf = async (request: FastifyRequest, design: DesignRecord) => {
    const viewer = viewerOf(request);
    const [chip, revision] = await Promise.all([
      operations.chipById(viewer, design.chipId),
      operations.revisionById(viewer, design.chipRevisionId),
    ]);
    if (!chip || !revision) throw notFound(`chip of design dsn_${design.id}`);
    return { chip, revision, model: operations.modelOf(revision) };
  };

  for (const suffix of [null, 'json', 'csv', 's2p'] as const) {
    const offered = OFFERS.filter((offer) => suffix === null || offer.suffix === suffix);
    app.get(`${DESIGNS_PATH}/:id/response${suffix === null ? '' : `.${suffix}`}`, {
      config: { access: 'design.read' },
      schema: describe({
        tag: DESIGNS_TAG,
        summary: 'The response of a design over a grid',
        about:
          'Complex field, transmission, phase, group delay and dispersion of one output. The Touchstone file (`.s2p`, version 1.1) has the input as port 1 and the chosen output as port 2.',
        params: designParams,
        query: curveQuery,
        headers: CONDITIONAL_HEADERS,
        answers: {
          200: {
            about: 'The curve.',
            content: Object.fromEntries(
              offered.map((offer) => [offer.mediaType, offer.suffix === 'json' ? curveAnswer : z.string()]),
            ),
          },
          304: { about: 'Unchanged.' },
        },
        problems: [
          'NOT_FOUND',
          'NOT_ACCEPTABLE',
          'WRONG_UNIT',
          'SPECIFICATION_INVALID',
          'PRECONDITION_FAILED',
        ],
      }),
      handler: async (request, reply) => {
        const offer = representationFor(request, offered, suffix);
        const ask = curveAskOf(readQuery(request, curveQuery));
        const design = await findDesign(request, deps);
        // Before the tag is compared: a grid that cannot be is refused, not 304.
        const curve = await curveOf(request, design, ask);
        const { chip, revision } = await partsOf(request, design);
        return answerTagged(request, reply, {
          etag: designTag(design, `${queryHash(ask)}.${offer.suffix}1`),
          mediaType: offer.contentType,
          fileName: `dsn_${design.id.slice(0, TAG_HASH_DIGITS)}.${curve.stage.toLowerCase()}.${curve.output.toLowerCase()}.${offer.suffix}`,
          render: () => {
            if (offer.suffix === 'csv') return responseCsv(curve);
            if (offer.suffix === 's2p') return touchstone(curve, { design, chip, revision });
            return JSON.stringify(responseJson(curve));
          },
        });
      },
    });
  }

  const plots = {
    transmission: async (request: FastifyRequest, design: DesignRecord) => {
      const { chip, revision, model } = await partsOf(request, design);
      const other = design.result.output === 'OUT1' ? 'OUT2' : 'OUT1';
      const wanted = [
        { stage: 'SETTING', output: design.result.output },
        { stage: 'TARGET', output: design.result.output },
        { stage: 'SETTING', output: other },
      ] as const;
      const curves = await Promise.all(wanted.map((ask) => curveOf(request, design, ask)));
      return transmissionPlot({
        title: titleOf(design, chip.serial, revision.number),
        offsetGhz: curves[0]!.offsetGhz,
        referenceFrequencyThz: model.referenceFrequencyThz,
        curves: curves.map(({ stage, output, transmissionDb }) => ({
          stage,
          output,
          values: transmissionDb,
        })),
        mask: design.result.mask,
        fsrGhz: model.fsrGhz,
      });
    },
    'group-delay': async (request: FastifyRequest, design: DesignRecord) => {
      const { chip, revision, model } = await partsOf(request, design);
      const { output, mask } = design.result;
      const passbands = mask.bands.filter(
        (band) => band.output === output && band.minTransmissionDb !== undefined,
      );
      const curves = await Promise.all(
        (['SETTING', 'TARGET'] as const).map((stage) => curveOf(request, design, { stage, output })),
      );
      return groupDelayPlot({
        title: titleOf(design, chip.serial, revision.number),
        offsetGhz: curves[0]!.offsetGhz,
        referenceFrequencyThz: model.referenceFrequencyThz,
        curves: curves.map(({ stage, output: port, groupDelayPs }) => ({
          stage,
          output: port,
          values: groupDelayPs,
        })),
        passes: (offsetGhz) => passbands.some((band) => isWithin(offsetGhz, band, model.fsrGhz)),
      });
    },
    'pole-zero': async (request: FastifyRequest, design: DesignRecord) => {
      const { chip, revision, model } = await partsOf(request, design);
      const { zeros, poles } = design.result.transferFunctions[design.result.output];
      return poleZeroPlot({
        title: titleOf(design, chip.serial, revision.number),
        zeros,
        poles,
        fsrGhz: model.fsrGhz,
      });
    },
  } as const;

  for (const [name, draw] of Object.entries(plots)) {
    app.get(`${DESIGNS_PATH}/:id/plots/${name}.svg`, {
      config: { access: 'design.read' },
      schema: describe({
        tag: DESIGNS_TAG,
        summary: `Plot: ${name.replace('-', ' ')}`,
        params: designParams,
        headers: CONDITIONAL_HEADERS,
        answers: {
          200: { about: 'SVG.', content: { 'image/svg+xml': z.string() } },
          304: { about: 'Unchanged.' },
        },
        problems: ['NOT_FOUND', 'PRECONDITION_FAILED'],
      }),
      handler: async (request, reply) => {
        const design = await findDesign(request, deps);
        // Scripts never run in it, and its own style element has to.
        reply.header(
          'content-security-policy',
          "default-src 'none'; style-src 'unsafe-inline'; frame-ancestors 'none'",
        );
        return answerTagged(request, reply, {
          etag: designTag(design, `${name}.svg1`),
          mediaType: 'image/svg+xml',
          fileName: `dsn_${design.id.slice(0, TAG_HASH_DIGITS)}.${name}.svg`,
          render: () => draw(request, design),
        });
      },
    });
  }
}

function titleOf(design: DesignRecord, serial: string, revision: number): string {
  return `Chip ${serial}, revision ${revision}: design ${design.id.slice(0, TAG_HASH_DIGITS)}`;
}
