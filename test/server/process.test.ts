/** The entry points as a person or a supervisor runs them: real processes, real signals, HTTP from outside. */
import { type ChildProcess, spawn } from 'node:child_process';
import { once } from 'node:events';
import { chmod, mkdtemp, rm, stat } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { setTimeout as sleep } from 'node:timers/promises';
import { afterAll, afterEach, beforeAll, describe, expect, it } from 'vitest';
import { createTestDatabase, type TestDatabase } from '../support/postgres.ts';
import { inventedChip } from './rest/invented-chips.ts';

const PATIENCE_MS = 60_000;
const TOKEN = `rbt_process00000_${'t'.repeat(43)}`;

interface Started {
  readonly child: ChildProcess;
  output(): string;
  /** Waits for `pattern` in what it wrote. */
  says(pattern: RegExp): Promise<RegExpExecArray>;
  /** @returns its exit code */
  end(signal: NodeJS.Signals): Promise<number | null>;
}

const running: Started[] = [];

function start(entry: string, environment: Record<string, string>): Started {
  const { DATABASE_URL: _, ...inherited } = process.env;
  const child = spawn(
    process.execPath,
    ['--import', 'tsx', new URL(`../../server/${entry}.ts`, import.meta.url).pathname],
    { env: { ...inherited, PORT: '0', ...environment }, stdio: ['ignore', 'pipe', 'pipe'], detached: true },
  );
  let output = '';
  for (const stream of [child.stdout, child.stderr])
    stream.on('data', (chunk: Buffer) => {
      output += chunk.toString();
    });
  const exited = once(child, 'exit');
  const started: Started = {
    child,
    output: () => output,
    async says(pattern) {
      for (const until = Date.now() + PATIENCE_MS; ; await sleep(20)) {
        const found = pattern.exec(output);
        if (found) return found;
        if (Date.now() > until || child.exitCode !== null)
          throw new Error(`it never said ${pattern}:\n${output}`);
      }
    },
    async end(signal) {
      child.kill(signal);
      await exited;
      return child.exitCode;
    },
  };
  running.push(started);
  return started;
}

const urlOf = async (api: Started): Promise<string> => (await api.says(/REST +(http:\/\/\S+)\/v1/))[1]!;

function call(
  url: string,
  method: string,
  token: string,
  body?: unknown,
  headers: Record<string, string> = {},
) {
  return fetch(url, {
    method,
    headers: { authorization: `Bearer ${token}`, 'content-type': 'application/json', ...headers },
    ...(body === undefined ? {} : { body: JSON.stringify(body) }),
  });
}

const halfBand = (chip: string) => ({
  chip,
  specification: {
    family: {
      ...{ family: 'ELLIPTIC', shape: 'LOW_PASS', order: 4, rippleDb: 2, rejectionDb: 40 },
      band: { offsetGhz: { low: -12.5, high: 12.5 } },
    },
  },
});

afterEach(async () => {
  await Promise.all(
    running
      .splice(0)
      .map((one) =>
        one.child.exitCode === null && one.child.signalCode === null ? one.end('SIGKILL') : null,
      ),
  );
});

describe('npm start', () => {
  let folder: string;
  beforeAll(async () => {
    folder = await mkdtemp(join(tmpdir(), 'ringbinder-start-'));
    // As root the database runs as another user, who must be able to pass.
    await chmod(folder, 0o755);
  });
  afterAll(() => rm(folder, { recursive: true, force: true }));

  it('serves from an empty folder, shows the first admin token once and not in its logs, and ends cleanly', async () => {
    const environment = { RINGBINDER_DATA: join(folder, 'data') };
    const first = start('main', environment);
    const url = await urlOf(first);
    const token = (await first.says(/rbt_\w{12}_[\w-]{43}/))[0];
    expect((await fetch(`${url}/readyz`)).status).toBe(200);
    expect((await call(`${url}/v1/me`, 'GET', token)).status).toBe(200);
    const logged = first
      .output()
      .split('\n')
      .filter((line) => line.startsWith('{'));
    expect(logged.join('\n')).not.toContain(token);
    expect(await first.end('SIGTERM')).toBe(0);

    const second = start('main', environment);
    const again = await urlOf(second);
    expect((await call(`${again}/v1/me`, 'GET', token)).status).toBe(200);
    expect(second.output()).not.toMatch(/rbt_/);
    // Ctrl-C in a terminal reaches every process of the group, and a launcher passes it on once more.
    const exited = once(second.child, 'exit');
    process.kill(-second.child.pid!, 'SIGINT');
    second.child.kill('SIGINT');
    await exited;
    expect(second.child.exitCode).toBe(0);
    expect(second.output()).not.toMatch(/"level":[56]0/);
  });

  it('ends cleanly with its npm, which tells only its shell', async () => {
    const entry = new URL('../../server/main.ts', import.meta.url).pathname;
    const environment = { npm_lifecycle_event: 'start', PORT: '0', RINGBINDER_DATA: join(folder, 'data') };
    const shell = spawn('/bin/sh', ['-c', `"${process.execPath}" --import tsx "${entry}"; true`], {
      env: { ...process.env, ...environment, DATABASE_URL: '' },
      stdio: ['ignore', 'pipe', 'inherit'],
    });
    let output = '';
    shell.stdout.on('data', (chunk: Buffer) => {
      output += chunk.toString();
    });
    await expect.poll(() => /REST +http/.test(output), { timeout: PATIENCE_MS }).toBe(true);
    shell.kill('SIGTERM');
    // The pipe closes when the last process that holds it has gone.
    await once(shell.stdout, 'close');
    expect(output).toContain('"cause":"parent gone"');
    expect(output).not.toMatch(/"level":[56]0/);
  });

  it('says which variable is wrong and starts nothing', async () => {
    const broken = start('main', { RINGBINDER_DATA: join(folder, 'other'), PORT: 'eighty' });
    await once(broken.child, 'exit');
    expect(broken.child.exitCode).toBe(78);
    expect(broken.output()).toContain('PORT must be a whole number');
    await expect(stat(join(folder, 'other'))).rejects.toThrow(/ENOENT/);
  });
});

describe('npm run api and npm run worker', () => {
  let database: TestDatabase;
  beforeAll(async () => {
    database = await createTestDatabase();
  });
  afterAll(() => database.drop());

  it('refuse to start without a database to share', async () => {
    for (const entry of ['api', 'worker']) {
      const lonely = start(entry, {});
      await once(lonely.child, 'exit');
      expect(lonely.child.exitCode).toBe(78);
      expect(lonely.output()).toContain('DATABASE_URL is needed');
    }
  });

  it('do the whole job apart: asked of one API, computed by a worker, read from another API', async () => {
    const shared = { DATABASE_URL: database.url, RINGBINDER_ADMIN_TOKEN: TOKEN };
    const heartbeat = join(await mkdtemp(join(tmpdir(), 'ringbinder-alive-')), 'alive');
    const worker = start('worker', { ...shared, RINGBINDER_THREADS: '1', RINGBINDER_HEARTBEAT: heartbeat });
    const [one, other] = await Promise.all([urlOf(start('api', shared)), urlOf(start('api', shared))]);
    const chip = { description: 'invented', model: inventedChip() };
    const registered = await call(`${one}/v1/chips/P-01`, 'PUT', TOKEN, chip, { 'if-none-match': '*' });
    expect(registered.status).toBe(201);
    await worker.says(/worker ready/);
    const asked = await call(`${one}/v1/design-requests`, 'POST', TOKEN, halfBand('P-01'), {
      prefer: 'wait=30',
    });
    expect(asked.status).toBe(200);
    const design = await call(`${other}${asked.headers.get('content-location')}`, 'GET', TOKEN);
    expect(design.status).toBe(200);
    expect(await design.json()).toMatchObject({ order: 4, architecture: 'ALL_PASS_PAIR' });
    expect(Date.now() - (await stat(heartbeat)).mtimeMs).toBeLessThan(10_000);
    // A health check as a container makes it.
    const healthy = start('healthcheck', { RINGBINDER_HEARTBEAT: heartbeat });
    const answering = start('healthcheck', { PORT: new URL(other).port });
    const nothingThere = start('healthcheck', { RINGBINDER_HEARTBEAT: `${heartbeat}-not` });
    await Promise.all([healthy, answering, nothingThere].map(({ child }) => once(child, 'exit')));
    expect([healthy, answering, nothingThere].map(({ child }) => child.exitCode)).toEqual([0, 0, 1]);
    for (const process of running.slice(0, 3)) expect(await process.end('SIGTERM')).toBe(0);
  });
});
