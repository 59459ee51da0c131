/** The clients under examples/, run as their own heads say, each against a service in a process of its own. */
import { mkdtemp, readFile, rm } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { missingAmong, notRun, run, type StartedService, startService } from './service.ts';

/** A design takes a second or two; the rest is room for a machine that is busy with other tests. */
const CLIENT_MS = 120_000;

const CLIENTS = [
  {
    name: 'examples/tour.sh',
    program: 'bash',
    missing: await missingAmong(['bash', 'curl', 'awk']),
  },
  { name: 'examples/tour.py', program: 'python3', missing: await missingAmong(['python3']) },
];

const PUMP_CHANNELS = 15;

/** Rows of a sheet by column name, without what differs from one publication to the next. */
function settingIn(csv: string): Record<string, string>[] {
  const [head = '', ...lines] = csv.split('\r\n').slice(0, -1);
  const names = head.split(',');
  return lines.map((line) => {
    const {
      version: _,
      sequence: __,
      ...rest
    } = Object.fromEntries(line.split(',').map((cell, i) => [names[i] ?? '', cell]));
    return rest;
  });
}

for (const { name, program, missing } of CLIENTS) {
  describe.skipIf(missing.length > 0)(`${name}${notRun(missing)}`, () => {
    let service: StartedService;
    let folder: string;
    beforeAll(async () => {
      service = await startService();
      folder = await mkdtemp(join(tmpdir(), 'ringbinder-client-'));
    });
    afterAll(async () => {
      await service.stop();
      await rm(folder, { recursive: true, force: true });
    });

    it(
      'does the whole job, and again on what is there then',
      async () => {
        const first = await run(program, [name, folder], service.environment);
        expect(first, first.output).toMatchObject({ code: 0 });
        expect(first.output).toMatch(/registered/);
        expect(first.output).toMatch(/refused, SPECIFICATION_UNREACHABLE: .*order 11.*order 6 at the most/);
        expect(first.output).toMatch(
          /nearest: the same edges, less rejection\n(.*\n)+ {2}CHEBYSHEV_I of order 6/,
        );
        expect(first.output).toMatch(/RUNNING|QUEUED|DONE 100 %/);
        // The requirement as it was asked: the pump at least 60 dB down, signal and idler within 1 dB.
        const reached = new Map(
          [...first.output.matchAll(/^ {2}(idler|pump|signal) +\S+ +\S+ +(\S+) +(\S+)$/gm)].map((found) => [
            found[1],
            { reached: Number(found[2]), margin: Number(found[3]) },
          ]),
        );
        expect(reached.get('pump')?.reached).toBeLessThanOrEqual(-60);
        expect(reached.get('signal')?.reached).toBeGreaterThanOrEqual(-1);
        expect(reached.get('idler')?.reached).toBeGreaterThanOrEqual(-1);
        for (const { margin } of reached.values()) expect(margin).toBeGreaterThanOrEqual(0);
        expect(first.output).toMatch(/CAUTION LASER_RADIATION: /);
        expect(first.output).toMatch(/pump-trap version 1\n {2}current is publication 1\n/);
        expect(first.output).toMatch(/ {2}200, 15 .*channels.*\n {2}304, nothing new since "1\./);

        const plot = await readFile(join(folder, 'HL-PR6-02-transmission.svg'), 'utf8');
        // As a truth value: a failure need not print the picture.
        expect(/^(<\?xml [^>]*\?>\s*)?<svg [\s\S]*<\/svg>\s*$/.test(plot)).toBe(true);
        const rows = settingIn(await readFile(join(folder, 'HL-PR6-02-setting.csv'), 'utf8'));
        expect(rows).toHaveLength(PUMP_CHANNELS);
        const printed = [...first.output.matchAll(/^ {2}(\d\d) +trap\.\S+ +(\d+\.\d{4}) +\d+\.\d\d$/gm)];
        expect(printed.map((found) => Number(found[2]))).toEqual(
          rows.map((row) => Number(Number(row.currentMa).toFixed(4))),
        );

        const second = await run(program, [name, folder], service.environment);
        expect(second, second.output).toMatchObject({ code: 0 });
        expect(second.output).toMatch(/known already/);
        expect(second.output).toMatch(/pump-trap version 2\n {2}current is publication 2\n/);
        expect(settingIn(await readFile(join(folder, 'HL-PR6-02-setting.csv'), 'utf8'))).toEqual(rows);
      },
      CLIENT_MS,
    );

    it(
      'says what is wrong and ends with a failure when its token is not valid or not given',
      async () => {
        const wrong = { ...service.environment, RINGBINDER_TOKEN: `rbt_aaaaaaaaaaaa_${'a'.repeat(43)}` };
        const refused = await run(program, [name, folder], wrong);
        expect(refused.code).not.toBe(0);
        expect(refused.output).toMatch(/A valid token is needed/);
        expect(refused.output).not.toContain(wrong.RINGBINDER_TOKEN);
        const none = await run(program, [name, folder], {
          RINGBINDER_URL: 'http://127.0.0.1:1',
          RINGBINDER_TOKEN: '',
        });
        expect(none.code).not.toBe(0);
      },
      CLIENT_MS,
    );
  });
}

describe('examples/watch.mjs', () => {
  let service: StartedService;
  beforeAll(async () => {
    service = await startService();
  });
  afterAll(() => service.stop());

  const watch = (...args: string[]) =>
    run(process.execPath, ['examples/watch.mjs', ...args], service.environment);

  it(
    'follows a request to its end and ends by itself, and says why where it cannot',
    async () => {
      const { RINGBINDER_URL: url, RINGBINDER_TOKEN: token } = service.environment;
      const send = async (method: string, path: string, file: string, headers = {}) =>
        fetch(`${url}${path}`, {
          method,
          headers: { authorization: `Bearer ${token}`, 'content-type': 'application/json', ...headers },
          body: await readFile(new URL(`../../examples/lab/${file}`, import.meta.url), 'utf8'),
        });
      const chip = await send('PUT', '/v1/chips/HL-IL50-01', 'chip-interleaver.json', {
        'if-none-match': '*',
      });
      expect(chip.status).toBe(201);
      const asked = await send('POST', '/v1/design-requests', 'request-interleaver.json');
      expect(asked.status).toBe(202);
      const { id } = (await asked.json()) as { id: string };
      const watched = await watch('request', id);
      expect(watched, watched.output).toMatchObject({ code: 0 });
      const states = watched.output
        .trim()
        .split('\n')
        .map((line) => JSON.parse(line) as { state: string; progress: number });
      expect(states.at(-1)).toMatchObject({ state: 'DONE', progress: 1 });
      expect(states.map(({ progress }) => progress)).toEqual(
        states.map(({ progress }) => progress).toSorted((a, b) => a - b),
      );

      const unknown = await watch('request', 'req_nothing');
      expect(unknown.code).toBe(1);
      expect(unknown.output).toMatch(/no such design request/);
      expect((await watch('something', 'else')).code).toBe(2);
    },
    CLIENT_MS,
  );
});
