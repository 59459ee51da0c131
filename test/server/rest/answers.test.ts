import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import type { z } from 'zod';
import * as answers from '../../../server/rest/answers.ts';
import { startNext } from './computing.ts';
import { type Service, startService } from './service.ts';

/** What the document promises is what is sent: every kind of answer, held against the rule that describes it. */
let service: Service;
let design = '';
let request = '';

beforeAll(async () => {
  service = await startService();
  await service.registerChip('ANS-1', {
    cells: [
      [2, 2],
      [1, 1],
    ],
  });
  const body = {
    chip: 'ANS-1',
    specification: {
      family: {
        family: 'BUTTERWORTH',
        shape: 'LOW_PASS',
        order: 3,
        band: { offsetGhz: { low: -6, high: 6 } },
      },
    },
  };
  const asked = await service.call('/v1/design-requests', { method: 'POST', body });
  expect(asked.status, asked.text).toBe(202);
  request = asked.json.id;
  await (await startNext(service.store)).finish();
  design = (await service.call(asked.headers.get('location')!)).json.design;
  await service.call('/v1/chips/ANS-1/configurations/main/versions', { method: 'POST', body: { design } });
  const publish = (accept: string[]) =>
    service.call('/v1/chips/ANS-1/releases/current', {
      method: 'PUT',
      body: { configuration: 'main', version: 1, accept },
    });
  const first = await publish([]);
  if (first.json.code === 'CAUTION_NOT_ACCEPTED') await publish(first.json.allowed);
});
afterAll(() => service?.stop());

const { connectionAnswer: page } = answers;

describe('answers', () => {
  const cases: readonly [string, (ids: { design: string; request: string }) => string, z.ZodType][] = [
    ['me', () => '/v1/me', answers.meAnswer],
    ['the service', () => '/v1/service', answers.serviceAnswer],
    ['chips', () => '/v1/chips', page(answers.chipAnswer)],
    ['a chip', () => '/v1/chips/ANS-1', answers.chipAnswer],
    ['revisions', () => '/v1/chips/ANS-1/revisions', page(answers.revisionAnswer)],
    ['a request', (ids) => `/v1/design-requests/${ids.request}`, answers.requestAnswer],
    ['requests', () => '/v1/design-requests', page(answers.requestAnswer)],
    ['a design', (ids) => `/v1/designs/${ids.design}`, answers.designAnswer],
    ['designs', () => '/v1/designs', page(answers.designAnswer)],
    ['a curve', (ids) => `/v1/designs/${ids.design}/response.json`, answers.curveAnswer],
    ['a netlist', (ids) => `/v1/designs/${ids.design}/netlist.json`, answers.netlistAnswer],
    ['the sheet of a design', (ids) => `/v1/designs/${ids.design}/setting.json`, answers.sheetAnswer],
    ['configurations', () => '/v1/chips/ANS-1/configurations', page(answers.configurationAnswer)],
    ['a configuration', () => '/v1/chips/ANS-1/configurations/main', answers.configurationAnswer],
    ['versions', () => '/v1/chips/ANS-1/configurations/main/versions', page(answers.versionAnswer)],
    ['the sheet of a version', () => '/v1/chips/ANS-1/configurations/main/versions/1', answers.sheetAnswer],
    ['releases', () => '/v1/chips/ANS-1/releases', answers.releasesAnswer],
    ['the log of a release', () => '/v1/chips/ANS-1/releases/current/log', page(answers.releaseAnswer)],
    ['the pull', () => '/v1/chips/ANS-1/releases/current', answers.sheetAnswer],
    ['the history', () => '/v1/history', page(answers.historyAnswer)],
  ];

  it.each(cases)('hold what the document says of %s', async (_, pathOf, rule) => {
    const answer = await service.call(pathOf({ design, request }));
    expect(answer.status, answer.text).toBe(200);
    const read = rule.safeParse(answer.json);
    expect(read.success ? null : read.error.issues.slice(0, 3)).toBe(null);
    if (Array.isArray(answer.json.edges)) expect(answer.json.edges.length).toBeGreaterThan(0);
  });

  it('hold what the document says of a check', async () => {
    const body = {
      chip: 'ANS-1',
      specification: {
        mask: {
          bands: [
            { interval: { offsetGhz: { low: -3, high: 3 } }, minTransmissionDb: -1 },
            { interval: { offsetGhz: { low: 15, high: 25 } }, maxTransmissionDb: -20 },
          ],
        },
      },
    };
    const answer = await service.call('/v1/specification-checks', { method: 'POST', body });
    expect(answer.status, answer.text).toBe(200);
    expect(answers.checkAnswer.safeParse(answer.json).error?.issues ?? null).toBe(null);
  });
});
