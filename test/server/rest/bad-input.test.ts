import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { inventedChip } from './invented-chips.ts';
import { type Answer, type Service, startService } from './service.ts';

let service: Service;

beforeAll(async () => {
  service = await startService();
  const registered = await service.registerChip('BAD-1', { cells: [[2, 2]] });
  expect(registered.status, registered.text).toBe(201);
});
afterAll(() => service?.stop());

const low = {
  family: 'ELLIPTIC',
  shape: 'LOW_PASS',
  order: 4,
  band: { offsetGhz: { low: -12.5, high: 12.5 } },
  rippleDb: 2,
  rejectionDb: 40,
};
const requestOf = (family: object) => ({ chip: 'BAD-1', specification: { family: { ...low, ...family } } });
const post = (body: unknown, headers: Record<string, string> = {}): Promise<Answer> =>
  service.call('/v1/design-requests', { method: 'POST', body, headers });

/** RFC 9457 sections 3 and 3.1: the media type, and `status` the same as that of the response. */
function expectProblem(answer: Answer, status: number, code: string): void {
  expect([answer.status, answer.json?.code], answer.text).toEqual([status, code]);
  expect(answer.headers.get('content-type')).toBe('application/problem+json');
  expect(answer.json.status).toBe(status);
  expect(answer.json.type).toMatch(/^\/problems\/[a-z-]+$/);
  expect(answer.json.title).toBeTypeOf('string');
  expect(answer.json.detail).not.toMatch(/undefined|\[object|node_modules|\.ts\b/);
}

describe('numbers that are none', () => {
  it.each([
    ['NaN', '{"chip":"BAD-1","specification":{"family":{"rippleDb":NaN}}}', '/specification/family/rippleDb'],
    [
      'Infinity',
      '{"chip":"BAD-1","specification":{"family":{"rippleDb":-Infinity}}}',
      '/specification/family/rippleDb',
    ],
    [
      '1e400',
      '{"chip":"BAD-1","specification":{"family":{"band":{"offsetGhz":{"low":-1e400,"high":1}}}}}',
      '/specification/family/band/offsetGhz/low',
    ],
  ])('refuses %s with its place', async (_, body, pointer) => {
    const answer = await post(body);
    expectProblem(answer, 400, 'BAD_INPUT');
    expect(answer.json.pointer).toBe(pointer);
    expect(answer.json.given).toMatchObject({ line: 1 });
  });

  it('refuses them as text too', async () => {
    const answer = await post(requestOf({ rippleDb: 'NaN' }));
    expectProblem(answer, 400, 'BAD_INPUT');
    expect(answer.json.pointer).toBe('/specification/family/rippleDb');
  });
});

describe('bodies', () => {
  it('refuses what is no JSON and says where', async () => {
    const answer = await post('{"chip": "BAD-1",\n  "specification": }');
    expectProblem(answer, 400, 'BAD_INPUT');
    expect(answer.json.given).toEqual({ line: 2, column: 20, character: 37 });
    expect(answer.json.pointer).toBe('/specification');
  });

  it.each([
    ['a NUL character', '{"chip":"BAD\\u0000"}'],
    ['half a surrogate pair', '{"chip":"BAD\\ud800"}'],
    ['a member that reaches a prototype', '{"chip":"BAD-1","__proto__":{"role":"ADMIN"}}'],
    ['a repeated member', '{"chip":"BAD-1","chip":"BAD-2"}'],
  ])('refuses %s', async (_, body) => {
    expectProblem(await post(body), 400, 'BAD_INPUT');
  });

  it('refuses bytes that are not UTF-8', async () => {
    const response = await fetch(`${service.url}/v1/design-requests`, {
      method: 'POST',
      headers: { authorization: `Bearer ${service.tokens.DESIGNER}`, 'content-type': 'application/json' },
      body: Buffer.from([0x22, 0xff, 0x22]),
    });
    expect(response.status).toBe(400);
    expect(await response.json()).toMatchObject({
      code: 'BAD_INPUT',
      detail: 'The body is not valid UTF-8.',
    });
  });

  it('refuses a body beyond 1 MiB', async () => {
    const answer = await post(JSON.stringify({ chip: 'x'.repeat(1_048_577) }));
    expectProblem(answer, 413, 'TOO_LARGE');
    expect(answer.json.allowed).toEqual({ max: 1_048_576, unit: 'byte' });
  });

  it.each([
    ['another media type', { 'content-type': 'text/plain' }],
    ['another charset', { 'content-type': 'application/json; charset=latin1' }],
    ['a content coding', { 'content-encoding': 'gzip' }],
  ])('refuses %s', async (_, headers) => {
    expectProblem(await post('{}', headers), 415, 'UNSUPPORTED_MEDIA_TYPE');
  });

  it('names every member that is missing or unknown', async () => {
    const answer = await post({ specfication: {} });
    expectProblem(answer, 400, 'BAD_INPUT');
    const pointers = answer.json.errors.map(({ pointer }: { pointer: string }) => pointer).sort();
    expect(pointers).toEqual(['/chip', '/specfication', '/specification']);
  });

  it.each([
    ['an absent body', undefined],
    ['null', 'null'],
    ['a list', '[]'],
    ['a string', '"BAD-1"'],
  ])('refuses %s', async (_, body) => {
    expectProblem(await post(body, { 'content-type': 'application/json' }), 400, 'BAD_INPUT');
  });
});

describe('specifications', () => {
  it.each([
    ['a negative ripple', { rippleDb: -1 }, '/specification/family/rippleDb'],
    ['order 0', { order: 0 }, '/specification/family/order'],
    ['order 1000', { order: 1000 }, '/specification/family/order'],
    [
      'crossed edges',
      { band: { offsetGhz: { low: 12.5, high: -12.5 } } },
      '/specification/family/band/offsetGhz',
    ],
  ])('refuses %s', async (_, family, pointer) => {
    const answer = await post(requestOf(family));
    expectProblem(answer, 422, 'SPECIFICATION_INVALID');
    expect(answer.json.pointer).toBe(pointer);
    expect(answer.json.given).toBeDefined();
  });

  it('refuses edges beyond half the free spectral range', async () => {
    const answer = await post(requestOf({ band: { offsetGhz: { low: -30, high: 30 } } }));
    expect(answer.status, answer.text).toBe(422);
    expect(answer.json.pointer).toMatch(/^\/specification\/family\/band/);
    expect(['SPECIFICATION_INVALID', 'SPECIFICATION_UNREACHABLE']).toContain(answer.json.code);
  });

  it.each([
    [
      'a wavelength where a frequency belongs',
      { centre: { frequencyThz: 1550 } },
      { centre: { wavelengthNm: 1550 } },
    ],
    [
      'a frequency where a wavelength belongs',
      { centre: { wavelengthNm: 193.1 } },
      { centre: { frequencyThz: 193.1 } },
    ],
  ])('refuses %s and offers the other member', async (_, wrong, right) => {
    const answer = await post(requestOf(wrong));
    expectProblem(answer, 422, 'WRONG_UNIT');
    expect(answer.json.pointer).toMatch(/^\/specification\/family\/centre/);
    const [offer] = answer.json.nearest;
    expect(offer.input.specification.family.centre).toEqual(right.centre);
    const check = { method: 'POST', body: offer.input };
    expect((await service.call('/v1/specification-checks', check)).json.ok).toBe(true);
  });

  it('refuses a mask that lets nothing pass', async () => {
    const bands = [{ interval: { offsetGhz: { low: -5, high: 5 } }, maxTransmissionDb: -30 }];
    const answer = await post({ chip: 'BAD-1', specification: { mask: { bands } } });
    expectProblem(answer, 422, 'SPECIFICATION_INVALID');
  });

  it('refuses two bands that fall on one point of the free spectral range with contrary demands', async () => {
    const bands = [
      { interval: { offsetGhz: { low: -2, high: 2 } }, minTransmissionDb: -1, label: 'signal' },
      { interval: { offsetGhz: { low: 49, high: 51 } }, maxTransmissionDb: -30, label: 'pump' },
    ];
    const answer = await post({ chip: 'BAD-1', specification: { mask: { bands } } });
    expectProblem(answer, 422, 'BANDS_COLLIDE');
    expect(answer.json.detail).toMatch(/free spectral range/i);
  });

  it('refuses an order beyond the rings of the chip and offers bodies that are accepted as they are', async () => {
    const answer = await post(requestOf({ order: 8 }));
    expectProblem(answer, 422, 'SPECIFICATION_UNREACHABLE');
    expect(answer.json.limit).toBe('RINGS');
    expect(answer.json.nearest.length).toBeGreaterThan(0);
    for (const { input } of answer.json.nearest) {
      const check = await service.call('/v1/specification-checks', { method: 'POST', body: input });
      expect(check.json, check.text).toMatchObject({ ok: true, problem: null });
    }
  });

  it('answers a refusal of a check as an answer, and stores nothing', async () => {
    const check = await service.call('/v1/specification-checks', {
      method: 'POST',
      body: requestOf({ order: 8 }),
    });
    expect(check.status).toBe(200);
    expect(check.json).toMatchObject({ ok: false, problem: { code: 'SPECIFICATION_UNREACHABLE' } });
    const requests = await service.call('/v1/design-requests');
    expect(requests.json.edges).toEqual([]);
  });

  it('does not know an unknown chip', async () => {
    const answer = await post({ ...requestOf({}), chip: 'NOT-HERE' });
    expectProblem(answer, 404, 'NOT_FOUND');
    expect(answer.json.pointer).toBe('/chip');
  });
});

describe('chips', () => {
  const put = (model: unknown) =>
    service.call('/v1/chips/BAD-2', { method: 'PUT', headers: { 'if-none-match': '*' }, body: { model } });

  it('names the channel that drives what is not there', async () => {
    const model = structuredClone(inventedChip()) as { channels: { drives: string }[] };
    model.channels[3]!.drives = 'cell9.ring1.phase';
    const answer = await put(model);
    expectProblem(answer, 400, 'BAD_INPUT');
    expect(answer.json.pointer).toBe('/model/channels/3/drives');
  });

  it('takes a reference frequency in THz only and sees through a wavelength', async () => {
    const answer = await put({ ...inventedChip(), referenceFrequencyThz: 1550 });
    expect([400, 422]).toContain(answer.status);
    expect(answer.json.pointer).toBe('/model/referenceFrequencyThz');
  });

  it('wants no member in the body that contradicts the path', async () => {
    const answer = await service.call('/v1/chips/BAD-2', {
      method: 'PUT',
      headers: { 'if-none-match': '*' },
      body: { serial: 'BAD-3', model: inventedChip() },
    });
    expectProblem(answer, 400, 'BAD_INPUT');
    expect(answer.json).toMatchObject({ pointer: '/serial', given: 'BAD-3', allowed: 'BAD-2' });
  });

  it('refuses a serial that is no name', async () => {
    const answer = await service.call('/v1/chips/%20x', {
      method: 'PUT',
      headers: { 'if-none-match': '*' },
      body: { model: inventedChip() },
    });
    expectProblem(answer, 400, 'BAD_INPUT');
  });
});

describe('queries and headers', () => {
  it.each([
    ['/v1/designs?minRejectonDb=3', '/minRejectonDb'],
    ['/v1/designs?first=', '/first'],
    ['/v1/designs?first=ten', '/first'],
    ['/v1/designs?first=201', '/first'],
    ['/v1/designs?first=1&first=2', '/first'],
    ['/v1/designs?met=yes', '/met'],
  ])('refuses %s', async (path, pointer) => {
    const answer = await service.call(path);
    expectProblem(answer, 400, 'BAD_INPUT');
    expect(answer.json.pointer).toBe(pointer);
  });

  it('refuses a cursor of another list', async () => {
    expectProblem(await service.call('/v1/chips?after=bm9uc2Vuc2U'), 400, 'BAD_CURSOR');
  });

  it.each([
    ['if-none-match', 'no-quotes'],
    ['if-match', '"a" "b"'],
  ])('refuses a malformed %s', async (header, value) => {
    expectProblem(await service.call('/v1/chips/BAD-1', { headers: { [header]: value } }), 400, 'BAD_INPUT');
  });

  it('refuses an idempotency key with spaces', async () => {
    expectProblem(await post(requestOf({}), { 'idempotency-key': 'a b' }), 400, 'BAD_INPUT');
  });

  it('refuses a path with a broken percent sign', async () => {
    expectProblem(await service.call('/v1/chips/%zz'), 400, 'BAD_INPUT');
  });
});
