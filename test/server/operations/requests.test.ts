import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { problemOf } from '../../../server/errors.ts';
import type { DesignRequest } from '../../../server/operations/index.ts';
import { smallModel } from '../../schema/invented-models.ts';
import { easyRequest, type Lab, openLab, refusalOf } from './lab.ts';

let lab: Lab;
beforeAll(async () => {
  lab = await openLab();
});
afterAll(() => lab.close());

const NM_THZ = 299_792.458;

function inNm(half: number) {
  const request = easyRequest(half);
  const band = { wavelengthNm: { low: NM_THZ / (193.1 + half / 1e3), high: NM_THZ / (193.1 - half / 1e3) } };
  return { ...request, specification: { family: { ...request.specification.family, band } } };
}

const mine = () => lab.viewers.DESIGNER;
const ask = (body: unknown, options = {}) => lab.operations.requestDesign(mine(), body, options);

describe('a design request', () => {
  it('[property] shares its computation with an equal one in other units, and is answered without a write once done', async () => {
    const first = await ask(easyRequest());
    expect(first).toMatchObject({ state: 'QUEUED', cached: false, createdBy: mine().actor.id });
    const second = await lab.operations.requestDesign(lab.colleague, inNm(6));
    expect(second.id).not.toBe(first.id);
    expect(second.computationId).toBe(first.computationId);
    await lab.compute(first);
    expect(await lab.operations.findRequest(mine(), second.id)).toMatchObject({ state: 'DONE', progress: 1 });

    const rows = await lab.countRows('request');
    const third = await ask(inNm(6));
    expect(await lab.countRows('request')).toBe(rows);
    expect(third).toMatchObject({ state: 'DONE', cached: true, createdBy: null, designId: third.design?.id });
  });

  it('[property] that was answered from the store is found again by its id and tells how to ask it', async () => {
    const cached = await ask(easyRequest());
    expect(cached.id).toBe(`req_${cached.designId}`);
    const { design: _, ...shown } = cached;
    expect(await lab.operations.findRequest(mine(), cached.id)).toMatchObject(shown);
    expect((await lab.operations.node(mine(), cached.id))?.type).toBe('DesignRequest');
    expect((await ask(cached.asked)).designId).toBe(cached.designId);
    expect(await lab.operations.findRequest(mine(), `req_${'0'.repeat(64)}`)).toBeNull();
  });

  it('[property] that was answered from the store is not, once the chip has moved on', async () => {
    expect((await ask(easyRequest())).cached).toBe(true);
    const model = { ...smallModel(), temperatureC: 21 };
    await lab.operations.reviseChip(mine(), { chip: 'X1', expectedRevision: 1, model });
    const anew = await ask(easyRequest());
    expect(anew).toMatchObject({ state: 'QUEUED', cached: false });
    await lab.compute(anew);
  });

  it('[property] that closed form refuses leaves no row, and what it offers is taken', async () => {
    const rows = await lab.countRows('request');
    const impossible = easyRequest();
    Object.assign(impossible.specification.family, { order: 9 });
    const problem = await refusalOf(ask(impossible));
    expect(problem).toMatchObject({
      code: 'SPECIFICATION_UNREACHABLE',
      status: 422,
      limit: 'RINGS',
      pointer: '/specification/family/order',
      given: 9,
    });
    expect(await lab.countRows('request')).toBe(rows);
    expect(problem.nearest.length).toBeGreaterThan(0);
    for (const { input } of problem.nearest) expect((await ask(input)).id).toMatch(/^req_/);
  });

  it('[property] that failed tells each asker in their own units, and the refusal answers the next one at once', async () => {
    const inGhz = await ask(easyRequest(7));
    const inWavelengths = await lab.operations.requestDesign(lab.colleague, inNm(7));
    const problem = problemOf('SETTING_UNREACHABLE', 'Invented: channel 02 would need 30 mA.', {
      pointer: '/specification/family/band/lowGhz',
      given: -7,
      limit: 'CHANNEL_CURRENT',
      nearest: [
        {
          reason: 'a narrower band',
          changes: [
            { pointer: '/specification/family/band/lowGhz', given: -7, works: -5, unit: 'GHz' },
            { pointer: '/specification/family/band/highGhz', given: 7, works: 5, unit: 'GHz' },
          ],
          input: null,
        },
        {
          reason: 'an order that the chip has no rings for',
          changes: [{ pointer: '/specification/family/order', given: 2, works: 9 }],
          input: null,
        },
      ],
    });
    await lab.refuse(inGhz, problem);
    const read = async (request: DesignRequest) =>
      (await lab.operations.findRequest(mine(), request.id))?.problem;
    expect(await read(inGhz)).toMatchObject({
      pointer: '/specification/family/band/offsetGhz/low',
      given: -7,
      nearest: [{ input: { specification: { family: { band: { offsetGhz: { low: -5, high: 5 } } } } } }],
    });
    const told = await read(inWavelengths);
    expect(told?.pointer).toBe('/specification/family/band/wavelengthNm/high');
    expect(told?.nearest).toHaveLength(1);
    expect(told?.nearest[0]?.changes[0]).toMatchObject({
      unit: 'nm',
      works: expect.closeTo(NM_THZ / 193.095, 9),
    });
    expect(await refusalOf(ask(easyRequest(7)))).toMatchObject({ code: 'SETTING_UNREACHABLE' });
  });

  it('[property] for another chip revision than the head is refused with the same request at the head', async () => {
    expect(await refusalOf(ask({ ...easyRequest(), chipRevision: 3 }))).toMatchObject({
      code: 'NOT_FOUND',
      pointer: '/chipRevision',
    });
    expect(await refusalOf(ask({ ...easyRequest(), chip: 'nowhere' }))).toMatchObject({
      code: 'NOT_FOUND',
      pointer: '/chip',
    });
    expect((await ask({ ...easyRequest(), chipRevision: 2 })).cached).toBe(true);
  });

  it('[property] with a key answers the same request again, from the header or the body, and refuses another body', async () => {
    const first = await ask(easyRequest(8), { idempotencyKey: 'key-1' });
    expect((await ask({ ...easyRequest(8), idempotencyKey: 'key-1' })).id).toBe(first.id);
    expect((await ask({ ...easyRequest(8), chipRevision: null }, { idempotencyKey: 'key-1' })).id).toBe(
      first.id,
    );
    expect(await refusalOf(ask(easyRequest(9), { idempotencyKey: 'key-1' }))).toMatchObject({
      code: 'IDEMPOTENCY_KEY_REUSED',
      status: 422,
    });
    const both = ask({ ...easyRequest(8), idempotencyKey: 'key-1' }, { idempotencyKey: 'key-2' });
    expect(await refusalOf(both)).toMatchObject({ code: 'BAD_INPUT', pointer: '/idempotencyKey' });
    const others = await lab.operations.requestDesign(lab.colleague, easyRequest(9), {
      idempotencyKey: 'key-1',
    });
    expect(others.id).not.toBe(first.id);
  });

  it('[property] is cancelled by whoever asked, once, and not by others', async () => {
    const request = await ask(easyRequest(10));
    const cancel = (viewer = mine(), id = request.id) => lab.operations.cancelDesignRequest(viewer, { id });
    expect(await refusalOf(cancel(lab.colleague))).toMatchObject({ code: 'FORBIDDEN', allowed: ['ADMIN'] });
    expect(await refusalOf(cancel(lab.viewers.READER))).toMatchObject({ code: 'FORBIDDEN' });
    expect(await cancel()).toMatchObject({ state: 'CANCELLED' });
    expect(await cancel()).toMatchObject({ state: 'CANCELLED' });
    const cached = await ask(easyRequest());
    expect(await refusalOf(cancel(mine(), cached.id))).toMatchObject({
      code: 'ALREADY_FINISHED',
      status: 409,
    });
    expect(await refusalOf(cancel(mine(), 'req_0'))).toMatchObject({ code: 'NOT_FOUND' });
  });

  it('[property] may be checked beforehand, and the check stores nothing', async () => {
    const rows = await lab.countRows('request');
    const check = (body: unknown) => lab.operations.checkSpecification(lab.viewers.READER, body);
    const known = await ask(easyRequest());
    expect(await check(easyRequest())).toMatchObject({
      ok: true,
      order: 2,
      rings: 2,
      cached: true,
      designHash: known.designId,
    });
    expect(await check(easyRequest(3))).toMatchObject({ ok: true, cached: false, problem: null });
    const wrong = easyRequest();
    Object.assign(wrong.specification.family, { rippleDb: -1 });
    expect(await check(wrong)).toMatchObject({
      ok: false,
      problem: { code: 'SPECIFICATION_INVALID' },
      designHash: null,
    });
    expect(await refusalOf(check({ chip: 'X1' }))).toMatchObject({ code: 'BAD_INPUT' });
    expect(await lab.countRows('request')).toBe(rows);
  });

  it('[property] is listed page by page, filtered, with cursors that fit one filter', async () => {
    const seen: string[] = [];
    let after: string | undefined;
    do {
      const page = await lab.operations.listRequests(mine(), { first: 2, ...(after ? { after } : {}) });
      seen.push(...page.edges.map((edge) => edge.node.id));
      after = page.pageInfo.hasNextPage ? (page.pageInfo.endCursor ?? undefined) : undefined;
    } while (after);
    expect(new Set(seen).size).toBe(await lab.countRows('request'));
    const cancelled = await lab.operations.listRequests(mine(), {
      filter: { state: ['CANCELLED'], mine: true },
    });
    expect(cancelled.edges.map((edge) => edge.node.state)).toEqual(['CANCELLED']);
    const cursor = cancelled.pageInfo.endCursor;
    expect(await refusalOf(lab.operations.listRequests(mine(), { after: cursor }))).toMatchObject({
      code: 'BAD_CURSOR',
    });
    expect(await refusalOf(lab.operations.listRequests(mine(), { first: 201 }))).toMatchObject({
      code: 'BAD_INPUT',
      pointer: '/first',
    });
  });

  it('[property] is asked for by makers and hidden from instruments', async () => {
    for (const role of ['READER', 'INSTRUMENT'] as const) {
      const refused = await refusalOf(lab.operations.requestDesign(lab.viewers[role], easyRequest()));
      expect(refused).toMatchObject({ code: 'FORBIDDEN', allowed: ['DESIGNER', 'ADMIN'] });
    }
    const cached = await ask(easyRequest());
    expect(await lab.operations.node(lab.viewers.INSTRUMENT, cached.id)).toBeNull();
    expect((await lab.operations.node(lab.viewers.INSTRUMENT, `dsn_${cached.designId}`))?.type).toBe(
      'Design',
    );
  });
});
