import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { withEdits } from '../../../schema/pointer.ts';
import { easyRequest, type Lab, openLab, refusalOf } from './lab.ts';

let lab: Lab;
beforeAll(async () => {
  lab = await openLab();
});
afterAll(() => lab.close());

const ask = (body: unknown) => lab.operations.requestDesign(lab.viewers.DESIGNER, body);
const FAMILY = '/specification/family';

const masked = (...bands: object[]) => ({ chip: 'X1', specification: { mask: { bands } } });

describe('input that cannot be', () => {
  it.each([
    ['NaN', `${FAMILY}/order`, Number.NaN, 'BAD_INPUT', 'NaN'],
    [
      'what the literal 1e400 reads as',
      `${FAMILY}/band/offsetGhz/high`,
      Number.POSITIVE_INFINITY,
      'BAD_INPUT',
      'Infinity',
    ],
    ['a negative ripple', `${FAMILY}/rippleDb`, -0.5, 'SPECIFICATION_INVALID', -0.5],
    ['order 0', `${FAMILY}/order`, 0, 'SPECIFICATION_INVALID', 0],
    ['order 1000', `${FAMILY}/order`, 1000, 'SPECIFICATION_INVALID', 1000],
    ['half an order', `${FAMILY}/order`, 2.5, 'BAD_INPUT', 2.5],
    ['an unknown family', `${FAMILY}/family`, 'BESSEL', 'BAD_INPUT', 'BESSEL'],
    ['an unknown member', `${FAMILY}/rippledb`, 1, 'BAD_INPUT', 1],
    ['a number as a serial', '/chip', 7, 'BAD_INPUT', 7],
  ])('[property] is refused at its place: %s', async (_, pointer, works, code, given) => {
    const problem = await refusalOf(ask(withEdits(easyRequest(), [{ pointer, works }])));
    expect(problem).toMatchObject({ code, pointer, given });
    expect(problem.detail).toContain(pointer);
  });

  it.each([
    ['missing altogether', undefined],
    ['null', null],
    ['a list', []],
    ['a text', 'chip'],
  ])('[property] is refused: a body that is %s', async (_, body) => {
    expect(await refusalOf(ask(body))).toMatchObject({ code: 'BAD_INPUT', pointer: '' });
  });

  it('[property] is refused: a member that would be inherited by everything', async () => {
    const body: unknown = JSON.parse(JSON.stringify(easyRequest()).replace('{', '{"__proto__":{"order":2},'));
    expect(await refusalOf(ask(body))).toMatchObject({ code: 'BAD_INPUT', pointer: '/__proto__' });
  });

  it('[property] is refused with all its faults at once', async () => {
    const problem = await refusalOf(ask({ chip: '', specification: { mask: { bands: [] } } }));
    expect(problem.errors.map((error) => error.pointer)).toEqual(['/chip', '/specification/mask/bands']);
    expect(problem.pointer).toBe('/chip');
  });

  it('[property] is refused: control characters and lone surrogates in labels', async () => {
    for (const label of ['a\u0000b', 'a\ud800']) {
      const band = { interval: { offsetGhz: { low: 0, high: 1 } }, minTransmissionDb: -1, label };
      expect(await refusalOf(ask(masked(band)))).toMatchObject({
        code: 'BAD_INPUT',
        pointer: '/specification/mask/bands/0/label',
      });
    }
  });

  it('[property] counts members that are null as absent', async () => {
    const body = withEdits(easyRequest(), []) as ReturnType<typeof easyRequest>;
    Object.assign(body, { chipRevision: null, synthesis: null });
    Object.assign(body.specification.family, { stopband: null, centre: null });
    const withNulls = await lab.operations.checkSpecification(lab.viewers.READER, body);
    const without = await lab.operations.checkSpecification(lab.viewers.READER, easyRequest());
    expect(withNulls.designHash).toBe(without.designHash);
    // GraphQL lets `{offsetGhz: null}` through its own check of one-of inputs.
    const empty = withEdits(easyRequest(), [{ pointer: `${FAMILY}/band`, works: { offsetGhz: null } }]);
    expect(await refusalOf(ask(empty))).toMatchObject({ code: 'BAD_INPUT', pointer: `${FAMILY}/band` });
  });
});

describe('input that can be mended', () => {
  // A band-pass lies around the middle of its band, wherever that is.
  const wrongUnit = (band: object) =>
    withEdits(easyRequest(), [
      { pointer: `${FAMILY}/shape`, works: 'BAND_PASS' },
      { pointer: `${FAMILY}/band`, works: band },
    ]);

  it.each([
    [
      'a wavelength as a frequency',
      { frequencyThz: { low: 1552.4, high: 1552.6 } },
      { wavelengthNm: { low: 1552.4, high: 1552.6 } },
    ],
    [
      'a frequency as a wavelength',
      { wavelengthNm: { low: 193.09, high: 193.11 } },
      { frequencyThz: { low: 193.09, high: 193.11 } },
    ],
    [
      'GHz as THz',
      { frequencyThz: { low: 193_090, high: 193_110 } },
      { frequencyThz: { low: 193.09, high: 193.11 } },
    ],
    [
      'µm as nm',
      { wavelengthNm: { low: 1.5524, high: 1.5526 } },
      { wavelengthNm: { low: 1552.4, high: 1552.6 } },
    ],
  ])('[property] is refused with the request to send: %s', async (_, band, works) => {
    const problem = await refusalOf(ask(wrongUnit(band)));
    expect(problem).toMatchObject({ code: 'WRONG_UNIT', status: 422 });
    expect(problem.nearest).toHaveLength(1);
    expect(problem.nearest[0]?.input).toEqual(wrongUnit(works));
    expect((await ask(problem.nearest[0]?.input)).id).toMatch(/^req_/);
  });

  it('[property] is followed until the chip takes it: a wavelength as a frequency, off the centre of a low-pass', async () => {
    const band = { frequencyThz: { low: 1552.4, high: 1552.6 } };
    const problem = await refusalOf(
      ask(withEdits(easyRequest(), [{ pointer: `${FAMILY}/band`, works: band }])),
    );
    expect(problem).toMatchObject({ code: 'WRONG_UNIT', status: 422 });
    expect(problem.nearest[0]?.reason).toMatch(/wavelength in nm; .*around the centre/);
    expect((await ask(problem.nearest[0]?.input)).id).toMatch(/^req_/);
  });

  it.each([
    ['an order of 0', 'order', 0],
    ['an order of 1000', 'order', 1000],
    ['an order of 65', 'order', 65],
  ])('[property] is refused with the request to send: %s', async (_, member, value) => {
    const problem = await refusalOf(
      ask(withEdits(easyRequest(), [{ pointer: `${FAMILY}/${member}`, works: value }])),
    );
    expect(problem).toMatchObject({
      code: 'SPECIFICATION_INVALID',
      pointer: `${FAMILY}/${member}`,
      given: value,
    });
    expect(problem.nearest[0]?.changes).toHaveLength(1);
    expect((await ask(problem.nearest[0]?.input)).id).toMatch(/^req_/);
  });

  it('[property] is refused with the request to send: crossed edges', async () => {
    const crossed = [{ pointer: `${FAMILY}/band`, works: { offsetGhz: { low: 6, high: -6 } } }];
    const problem = await refusalOf(ask(withEdits(easyRequest(), crossed)));
    expect(problem).toMatchObject({ code: 'SPECIFICATION_INVALID', pointer: `${FAMILY}/band/offsetGhz` });
    expect(problem.nearest[0]?.input).toEqual(easyRequest());
    expect((await ask(problem.nearest[0]?.input)).id).toMatch(/^req_/);
  });

  it('[property] is refused with the request to send: a rejection written without its sign', async () => {
    const interval = { offsetGhz: { low: -2, high: 2 } };
    const stopped = { interval: { offsetGhz: { low: 15, high: 25 } }, maxTransmissionDb: -5 };
    const problem = await refusalOf(ask(masked({ interval, minTransmissionDb: 3 }, stopped)));
    expect(problem.nearest[0]?.changes).toEqual([
      { pointer: '/specification/mask/bands/0/minTransmissionDb', given: 3, works: -3, unit: 'dB' },
    ]);
  });

  it('[property] is refused by the core with its place: edges beyond the free spectral range', async () => {
    const problem = await refusalOf(ask(easyRequest(30)));
    expect(problem).toMatchObject({
      code: 'SPECIFICATION_INVALID',
      limit: 'FREE_SPECTRAL_RANGE',
      pointer: `${FAMILY}/band`,
    });
    for (const { input } of problem.nearest) expect((await ask(input)).id).toMatch(/^req_/);
  });

  it('[property] is refused by the core with its place: a mask that lets nothing pass', async () => {
    const band = { interval: { offsetGhz: { low: 0, high: 1 } }, maxTransmissionDb: -30 };
    expect(await refusalOf(ask(masked(band)))).toMatchObject({
      code: 'SPECIFICATION_INVALID',
      pointer: '/specification/mask/bands',
    });
  });
});
