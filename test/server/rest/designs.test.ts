import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { NM_THZ } from '../../../src/conventions.ts';
import { startNext } from './computing.ts';
import { type Service, startService } from './service.ts';

/** Input and output coupler, arm, and coupler and phase of four rings. */
const CHANNELS = 11;

let service: Service;
let design: string;

beforeAll(async () => {
  service = await startService();
  await service.registerChip('DSN-1');
  const families = [
    {
      family: 'ELLIPTIC',
      shape: 'LOW_PASS',
      order: 4,
      band: { offsetGhz: { low: -12.5, high: 12.5 } },
      rippleDb: 2,
      rejectionDb: 40,
    },
    { family: 'BUTTERWORTH', shape: 'LOW_PASS', order: 2, band: { offsetGhz: { low: -5, high: 5 } } },
    { family: 'BUTTERWORTH', shape: 'LOW_PASS', order: 3, band: { offsetGhz: { low: -5, high: 5 } } },
  ];
  const ids: string[] = [];
  for (const family of families) {
    const body = { chip: 'DSN-1', specification: { family } };
    const asked = await service.call('/v1/design-requests', { method: 'POST', body });
    expect(asked.status, asked.text).toBe(202);
    await (await startNext(service.store)).finish();
    ids.push((await service.call(asked.headers.get('location')!)).json.design);
  }
  design = ids[0]!;
});
afterAll(() => service?.stop());

const get = (rest: string, headers: Record<string, string> = {}) =>
  service.call(`/v1/designs/${design}${rest}`, { headers });

describe('a design', () => {
  it('states what was asked, what was made of it and how well it does', async () => {
    const { json, headers } = await get('');
    expect(json).toMatchObject({ id: design, chip: 'DSN-1', chipRevision: 1, order: 4, family: 'ELLIPTIC' });
    expect(json.compliance.bands.length).toBeGreaterThan(0);
    expect(json.setting.channels.length).toBe(CHANNELS);
    expect((await get('', { 'if-none-match': headers.get('etag')! })).status).toBe(304);
  });

  it('is 404 when it is not there or its id is none', async () => {
    for (const id of [`dsn_${'0'.repeat(64)}`, 'dsn_1', 'nonsense']) {
      expect([id, (await service.call(`/v1/designs/${id}`)).status]).toEqual([id, 404]);
    }
  });
});

describe('its response', () => {
  it('is one free spectral range around the reference unless a grid is asked for', async () => {
    const { json } = await get('/response.json');
    expect(json).toMatchObject({ stage: 'SETTING', output: 'OUT1' });
    expect(json.offsetGhz[0]).toBeCloseTo(-25, 9);
    expect(json.offsetGhz.at(-1)).toBeCloseTo(25, 9);
    expect(json.transmissionDb.length).toBe(json.offsetGhz.length);
    expect(Math.max(...json.transmissionDb)).toBeLessThanOrEqual(0);
  });

  it('takes a grid in THz, nm, GHz or FSR and states every unit of it', async () => {
    const { json } = await get(
      '/response.json?unit=frequencyThz&start=193.09&stop=193.11&points=5&output=OUT1&stage=TARGET',
    );
    expect(json.offsetGhz.map((value: number) => Math.round(value * 1e6) / 1e6)).toEqual([-10, -5, 0, 5, 10]);
    // Vacuum wavelength λ = c/ν, c exact by definition of the metre (SI Brochure, 9th edition, 2019).
    for (const [i, nm] of json.wavelengthNm.entries())
      expect(nm * json.frequencyThz[i]).toBeCloseTo(NM_THZ, 6);
    const fsr = await get('/response.json?unit=offsetFsr&start=-0.5&stop=0.5&points=3');
    expect(fsr.json.offsetGhz).toEqual([-25, 0, 25]);
  });

  it('is 422 beyond 20,001 points, and says the limit', async () => {
    const answer = await get('/response?start=-20&stop=20&points=100000');
    expect([answer.status, answer.json.code, answer.json.pointer]).toEqual([
      422,
      'SPECIFICATION_INVALID',
      '/points',
    ]);
    expect(answer.json).toMatchObject({ given: 100_000, allowed: { max: 20_001 }, limit: 'GRID_POINTS' });
  });

  it.each([
    ['start without stop', '?start=1', 400, '/stop'],
    ['a wavelength in THz', '?unit=frequencyThz&start=1550&stop=1551', 422, '/unit'],
    ['a grid turned round', '?start=5&stop=-5', 422, '/unit'],
    ['an unknown stage', '?stage=IDEAL', 400, '/stage'],
    ['one point', '?start=-5&stop=5&points=1', 400, '/points'],
  ])('refuses %s in terms of the query', async (_, query, status, pointer) => {
    const answer = await get(`/response${query}`);
    expect([answer.status, answer.json.pointer], answer.text).toEqual([status, pointer]);
    expect(answer.json.detail).not.toContain('/grid');
  });

  // Column order and empty fields: the service's contract; records and line ends: RFC 4180 sections 2.1 and 2.4.
  it('[published] comes as CSV with CRLF after every record and as many fields in each', async () => {
    const { text, headers } = await get('/response.csv?start=-20&stop=20&points=101');
    expect(headers.get('content-type')).toBe('text/csv; charset=utf-8; header=present');
    const lines = text.split('\r\n');
    expect(lines[0]).toBe(
      'frequencyThz,wavelengthNm,offsetGhz,fieldRe,fieldIm,transmissionDb,phaseRad,groupDelayPs,dispersionPsPerNm',
    );
    expect([lines.length, lines.at(-1)]).toEqual([103, '']);
    for (const line of lines.slice(0, -1)) expect(line.split(',').length).toBe(9);
  });

  // Touchstone 1.1: option line, GHz, real and imaginary parts, column order S11 S21 S12 S22, ascending frequencies.
  it('[published] comes as a Touchstone two-port file of the same field', async () => {
    const query = 'start=-20&stop=20&points=11';
    const { text, headers } = await get(`/response.s2p?${query}`);
    expect(headers.get('content-type')).toBe('text/plain; charset=us-ascii');
    expect(headers.get('content-disposition')).toMatch(/filename="dsn_[0-9a-f]{12}\.setting\.out1\.s2p"/);
    const lines = text.split(/\r?\n/).filter((line) => line !== '' && !line.startsWith('!'));
    expect(lines[0]).toBe('# GHz S RI R 50');
    const { json } = await get(`/response.json?${query}`);
    const rows = lines.slice(1).map((line) => line.split(/\s+/).map(Number));
    expect(rows.length).toBe(11);
    for (const [i, row] of rows.entries()) {
      expect(row[0]! / 1000).toBeCloseTo(json.frequencyThz[i], 9);
      const [re, im] = [json.field.re[i], json.field.im[i]];
      for (const [column, value] of [0, 0, re, im, re, im, 0, 0].entries())
        expect(row[column + 1]).toBeCloseTo(value, 9);
      if (i > 0) expect(row[0]).toBeGreaterThan(rows[i - 1]![0]!);
    }
  });

  it('has a tag for every question and representation, and is 304 by it', async () => {
    const paths = [
      '/response.json',
      '/response.csv',
      '/response.json?output=OUT2',
      '/response.json?points=11',
    ];
    const tags = await Promise.all(paths.map(async (path) => (await get(path)).headers.get('etag')!));
    expect(new Set(tags).size).toBe(paths.length);
    expect((await get(paths[1]!, { 'if-none-match': tags[1]! })).status).toBe(304);
  });

  it('obeys Accept without a suffix, and the suffix against Accept', async () => {
    expect((await get('/response', { accept: 'text/csv' })).headers.get('content-type')).toMatch(
      /^text\/csv/,
    );
    expect((await get('/response.json', { accept: 'text/csv' })).headers.get('content-type')).toBe(
      'application/json',
    );
    expect((await get('/response', { accept: 'audio/ogg' })).status).toBe(406);
  });
});

describe('what else is made of it', () => {
  it('is a setting sheet without release and configuration', async () => {
    const csv = await get('/setting.csv');
    expect(csv.text.split('\r\n')[1]).toMatch(new RegExp(`^1,DSN-1,1,,,,,${CHANNELS},01,`));
    const json = await get('/setting', { accept: 'application/json' });
    expect(json.json.channels.length).toBe(CHANNELS);
  });

  it('is a netlist whose connections end at its elements', async () => {
    const { json } = await get('/netlist.json');
    const ids = new Set(json.elements.map(({ id }: { id: string }) => id));
    const elementOf = (port: string): string => port.slice(0, port.lastIndexOf('.'));
    expect(json.connections.length).toBeGreaterThan(0);
    for (const [from, to] of json.connections) {
      expect(ids.has(elementOf(from))).toBe(true);
      expect(ids.has(elementOf(to))).toBe(true);
    }
    expect(Object.keys(json.ports)).toEqual(expect.arrayContaining(['in1', 'out1']));
  });

  it.each(['transmission', 'group-delay', 'pole-zero'])(
    'is a %s plot that runs and loads nothing',
    async (name) => {
      const { status, text, headers } = await get(`/plots/${name}.svg`);
      expect([status, headers.get('content-type')]).toEqual([200, 'image/svg+xml']);
      expect(headers.get('content-security-policy')).toMatch(/default-src 'none'/);
      expect(text).toMatch(/^<svg|^<\?xml/);
      expect(text).not.toMatch(/<script|href="http|url\(http/);
    },
  );
});

describe('searching', () => {
  const found = async (query: string) => {
    const { status, json, text } = await service.call(`/v1/designs${query}`);
    expect(status, text).toBe(200);
    return json.edges.map(({ node }: { node: { order: number } }) => node.order) as number[];
  };

  it('filters and orders', async () => {
    expect(await found('')).toEqual([3, 2, 4]);
    expect(await found('?family=ELLIPTIC')).toEqual([4]);
    expect(await found('?chip=DSN-1&first=2')).toEqual([3, 2]);
    expect((await found('?minRejectionDb=200')).length).toBe(0);
    expect((await found('?order=REJECTION')).sort()).toEqual([2, 3, 4]);
    expect((await service.call('/v1/designs?chip=NOT-HERE')).status).toBeLessThan(500);
  });
});
