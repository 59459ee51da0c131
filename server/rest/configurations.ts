/** Configurations of a chip and their immutable versions. */
import type { FastifyInstance, FastifyRequest } from 'fastify';
import { z } from 'zod';
import { badInput, notFound } from '../errors.ts';
import type { ChipRecord, ConfigurationRecord, VersionRecord } from '../store/records.ts';
import { settingSheetCsv, settingSheetJson, versionSheet } from '../views/index.ts';
import {
  configurationAnswer,
  connectionAnswer,
  saveVersionBody,
  sheetAnswer,
  versionAnswer,
} from './answers.ts';
import { CONDITIONAL_HEADERS, describe, IDEMPOTENCY_HEADER } from './describe.ts';
import { viewerOf } from './frame/index.ts';
import { chipOf, numberOf, paramOf, serialParams, writeOptionsOf } from './parameters.ts';
import { expectationOf, expectedNumber, withPresentTag } from './preconditions.ts';
import { splitSuffix } from './protocol/index.ts';
import { listAskOf, pageQuery, readQuery, withMembers } from './query.ts';
import { answerPage, recordText } from './record-answers.ts';
import {
  answerTagged,
  answerWritten,
  CSV_OFFER,
  JSON_OFFER,
  JSON_TYPE,
  representationFor,
  TAG_HASH_DIGITS,
} from './reply.ts';
import type { RestDeps } from './rest.ts';
import { configurationsWire, versionsWire } from './wire.ts';

const TAG = 'Configurations';
const PATH = '/v1/chips/:serial/configurations';
const pageOnly = z.strictObject(pageQuery);
const nameParams = serialParams.extend({ name: z.string().describe('Name of the configuration.') });
const versionParams = nameParams.extend({
  number: z.string().describe('Number of the version, from 1, optionally with `.json` or `.csv`.'),
});
const OFFERS = [JSON_OFFER, CSV_OFFER];

const versionTag = (version: VersionRecord, suffix: string): string =>
  `"${version.number}.${version.contentHash.slice(0, TAG_HASH_DIGITS)}.${suffix}1"`;

/** The last version alone is what a save expects; whether it is stale depends on the chip's head too. */
const tagsOfConfiguration = (chip: ChipRecord, configuration: ConfigurationRecord): readonly string[] => [
  `"${configuration.lastVersion}.${chip.headRevision}.json1"`,
  `"${configuration.lastVersion}"`,
];

export function registerConfigurations(app: FastifyInstance, deps: RestDeps): void {
  const { operations } = deps;

  const configurationOf = async (request: FastifyRequest, chip: ChipRecord): Promise<ConfigurationRecord> => {
    const name = paramOf(request, 'name');
    const configuration = await operations.findConfiguration(viewerOf(request), chip, name);
    if (!configuration) throw notFound(`configuration ${name.slice(0, 64)} of chip ${chip.serial}`);
    return configuration;
  };

  app.get(PATH, {
    config: { access: 'configuration.read' },
    schema: describe({
      tag: TAG,
      summary: 'List the configurations of a chip',
      params: serialParams,
      query: pageOnly,
      headers: CONDITIONAL_HEADERS,
      answers: {
        200: { about: 'A page.', content: { [JSON_TYPE]: connectionAnswer(configurationAnswer) } },
        304: { about: 'Unchanged.' },
      },
      problems: ['BAD_CURSOR', 'NOT_FOUND'],
    }),
    handler: async (request, reply) => {
      const viewer = viewerOf(request);
      const chip = await chipOf(request, operations);
      const page = await operations.listConfigurations(viewer, chip, listAskOf(readQuery(request, pageOnly)));
      return answerPage(deps, request, reply, page, configurationsWire);
    },
  });

  app.get(`${PATH}/:name`, {
    config: { access: 'configuration.read' },
    schema: describe({
      tag: TAG,
      summary: 'Read a configuration with its latest version',
      params: nameParams,
      headers: CONDITIONAL_HEADERS,
      answers: {
        200: { about: 'The configuration.', content: { [JSON_TYPE]: configurationAnswer } },
        304: { about: 'Unchanged.' },
      },
      problems: ['NOT_FOUND', 'PRECONDITION_FAILED'],
    }),
    handler: async (request, reply) => {
      const chip = await chipOf(request, operations);
      const configuration = await configurationOf(request, chip);
      return answerTagged(request, reply, {
        etag: tagsOfConfiguration(chip, configuration)[0]!,
        mediaType: JSON_TYPE,
        render: () => recordText(deps, request, configurationsWire, configuration),
      });
    },
  });

  app.get(`${PATH}/:name/versions`, {
    config: { access: 'configuration.read' },
    schema: describe({
      tag: TAG,
      summary: 'List the versions of a configuration',
      params: nameParams,
      query: pageOnly,
      headers: CONDITIONAL_HEADERS,
      answers: {
        200: { about: 'A page.', content: { [JSON_TYPE]: connectionAnswer(versionAnswer) } },
        304: { about: 'Unchanged.' },
      },
      problems: ['BAD_CURSOR', 'NOT_FOUND'],
    }),
    handler: async (request, reply) => {
      const viewer = viewerOf(request);
      const configuration = await configurationOf(request, await chipOf(request, operations));
      const page = await operations.listVersions(
        viewer,
        configuration,
        listAskOf(readQuery(request, pageOnly)),
      );
      return answerPage(deps, request, reply, page, versionsWire);
    },
  });

  app.post(`${PATH}/:name/versions`, {
    config: { access: 'version.save' },
    schema: describe({
      tag: TAG,
      summary: 'Save a design as the next version',
      about:
        'The configuration is made by its first version. `If-Match: "<last version>"` saves only while that is the last one; `If-None-Match: *` only the first.',
      params: nameParams,
      body: saveVersionBody,
      headers: {
        'if-match': '`"<last version>"`',
        'if-none-match': '`*`: only the first version.',
        ...IDEMPOTENCY_HEADER,
      },
      answers: {
        200: { about: 'Saved before with this idempotency key.', content: { [JSON_TYPE]: versionAnswer } },
        201: { about: 'Saved.', content: { [JSON_TYPE]: versionAnswer } },
      },
      problems: [
        'NOT_FOUND',
        'TOO_LARGE',
        'UNSUPPORTED_MEDIA_TYPE',
        'STALE_CHIP_REVISION',
        'PRECONDITION_FAILED',
        'IDEMPOTENCY_KEY_REUSED',
      ],
    }),
    handler: async (request, reply) => {
      const viewer = viewerOf(request);
      const chip = await chipOf(request, operations);
      const options = writeOptionsOf(request);
      const expectedVersion = await expectedVersionOf(request, chip, options.idempotencyKey !== undefined);
      const body = withMembers(request.body, {
        chip: chip.serial,
        configuration: paramOf(request, 'name'),
        expectedVersion,
      });
      const saved = await withPresentTag(
        () => operations.saveVersion(viewer, body, options),
        () => presentTag(request, chip),
      );
      const { record, replayed } = saved;
      const location = `/v1/chips/${chip.serial}/configurations/${record.configurationName}/versions/${record.number}`;
      const wire = await recordText(deps, request, versionsWire, record);
      return answerWritten(reply, !replayed, location, versionTag(record, 'json'), wire);
    },
  });

  app.get(`${PATH}/:name/versions/:number`, {
    config: { access: 'configuration.read' },
    schema: describe({
      tag: TAG,
      summary: 'The setting sheet of a version',
      about:
        'Every driver channel of the chip, unused ones at 0 mA. This version need not be the released one: instruments pull the release instead.',
      params: versionParams,
      headers: CONDITIONAL_HEADERS,
      answers: {
        200: { about: 'The sheet.', content: { [JSON_TYPE]: sheetAnswer, 'text/csv': z.string() } },
        304: { about: 'Unchanged.' },
      },
      problems: ['NOT_FOUND', 'NOT_ACCEPTABLE', 'PRECONDITION_FAILED'],
    }),
    handler: async (request, reply) => {
      const { stem, suffix } = splitSuffix(paramOf(request, 'number'), OFFERS);
      const offer = representationFor(request, OFFERS, suffix);
      const chip = await chipOf(request, operations);
      const configuration = await configurationOf(request, chip);
      const number = numberOf(stem);
      const version =
        number === null ? null : await operations.findVersion(viewerOf(request), configuration, number);
      if (!version) throw notFound(`version ${stem.slice(0, 20)} of configuration ${configuration.name}`);
      return answerTagged(request, reply, {
        etag: versionTag(version, offer.suffix),
        mediaType: offer.contentType,
        fileName: `${chip.serial}.${configuration.name}.${version.number}.${offer.suffix}`,
        render: () => {
          const sheet = versionSheet(version, chip);
          return offer.suffix === 'csv' ? settingSheetCsv(sheet) : JSON.stringify(settingSheetJson(sheet));
        },
      });
    },
  });

  const presentTag = async (request: FastifyRequest, chip: ChipRecord): Promise<string | null> => {
    const present = await operations.findConfiguration(viewerOf(request), chip, paramOf(request, 'name'));
    return present ? tagsOfConfiguration(chip, present)[1]! : null;
  };

  async function expectedVersionOf(
    request: FastifyRequest,
    chip: ChipRecord,
    mayBeRepeat: boolean,
  ): Promise<number | undefined> {
    const { kind, tags } = expectationOf(request);
    if (kind === 'NONE') return undefined;
    if (kind === 'NEW') return 0;
    if (tags === undefined) throw badInput('If-Match names no tag.');
    const present = await operations.findConfiguration(viewerOf(request), chip, paramOf(request, 'name'));
    const number = present?.lastVersion ?? 0;
    return expectedNumber(
      tags,
      { number, tags: present ? tagsOfConfiguration(chip, present) : [] },
      mayBeRepeat,
    );
  }
}
