/** The service as it is run (API and worker apart, an embedded PostgreSQL), the bare server beside it, and a release. */
import { type ChildProcess, spawn } from 'node:child_process';
import { once } from 'node:events';
import { chmodSync, mkdtempSync, openSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { setTimeout as sleep } from 'node:timers/promises';
import { fileURLToPath } from 'node:url';
import pg from 'pg';
import { generateToken } from '../../server/auth/index.ts';
import { startEmbedded } from '../../server/embedded/index.ts';
import { inventedChip } from '../server/rest/invented-chips.ts';

const PATIENCE_MS = 60_000;
const CHIP = 'BENCH-01';
/** The greatest that the configuration takes: one token sends everything here. */
const RATE_PER_S = '1000000';

export interface Answer {
  readonly status: number;
  readonly headers: Headers;
  readonly text: string;
}

export interface Services {
  readonly api: string;
  readonly bare: string;
  readonly token: string;
  readonly chip: string;
  /** A design that is in the store: what to ask for it with, and its address. */
  readonly stored: { readonly body: string; readonly id: string };
  /** A release of it. */
  readonly release: { readonly path: string; readonly etag: string; readonly versionId: string };
  call(
    path: string,
    method?: string,
    body?: unknown,
    headers?: Readonly<Record<string, string>>,
  ): Promise<Answer>;
  stop(): Promise<void>;
}

/** The half-band of the design rows; another `edgeGhz` is another design. */
export function requestBody(chip: string, edgeGhz: number, order = 4): Record<string, unknown> {
  return {
    chip,
    specification: {
      family: {
        ...{ family: 'ELLIPTIC', shape: 'LOW_PASS', order, rippleDb: 2, rejectionDb: 40, output: 'OUT2' },
        band: { offsetGhz: { low: -edgeGhz, high: edgeGhz } },
      },
    },
  };
}

interface Started {
  /** Waits for `pattern` in what it wrote and returns its first group. */
  says(pattern: RegExp): Promise<string>;
  stop(): Promise<void>;
}

/** Its output goes to a file, as a supervisor would have it: reading it along would cost the one who measures. */
function start(file: string, folder: string, environment: Readonly<Record<string, string>>): Started {
  const log = join(folder, `${file.replaceAll('/', '-')}.log`);
  const descriptor = openSync(log, 'w');
  const entry = fileURLToPath(new URL(`../../${file}.ts`, import.meta.url));
  const child: ChildProcess = spawn(process.execPath, ['--import', 'tsx', entry], {
    env: { ...process.env, ...environment },
    stdio: ['ignore', descriptor, descriptor],
  });
  const exited = once(child, 'exit');
  return {
    async says(pattern) {
      for (const until = Date.now() + PATIENCE_MS; ; await sleep(20)) {
        const found = pattern.exec(readFileSync(log, 'utf8'));
        if (found) return found[1] ?? '';
        if (child.exitCode !== null || Date.now() > until)
          throw new Error(`${file} never said ${pattern}:\n${readFileSync(log, 'utf8')}`);
      }
    },
    async stop() {
      if (child.exitCode === null && child.signalCode === null) child.kill('SIGTERM');
      await exited;
    },
  };
}

/** Publishes the stored design, so that there is something to pull. */
async function publish(
  services: Pick<Services, 'call'>,
  design: string,
): Promise<{ path: string; etag: string }> {
  const chip = `/v1/chips/${CHIP}`;
  const saved = await services.call(`${chip}/configurations/bench/versions`, 'POST', { design });
  if (saved.status !== 201) throw new Error(`version: ${saved.status} ${saved.text}`);
  // An invented chip on no bench: nobody is near its light.
  const accept = ['MASK_NOT_MET', 'LASER_RADIATION'];
  const published = await services.call(`${chip}/releases/current`, 'PUT', {
    ...{ configuration: 'bench', version: 1, accept },
  });
  if (published.status !== 201) throw new Error(`release: ${published.status} ${published.text}`);
  const path = `${chip}/releases/current.json`;
  const pulled = await services.call(path);
  return { path, etag: pulled.headers.get('etag') ?? '' };
}

async function versionIdOf(databaseUrl: string): Promise<string> {
  const client = new pg.Client({ connectionString: databaseUrl });
  await client.connect();
  try {
    const { rows } = await client.query<{ id: string }>('select id from configuration_version');
    return rows[0]!.id;
  } finally {
    await client.end();
  }
}

async function prepare(
  api: string,
  bare: string,
  token: string,
  databaseUrl: string,
): Promise<Omit<Services, 'stop'>> {
  const call: Services['call'] = async (path, method = 'GET', body = undefined, headers = {}) => {
    const response = await fetch(`${api}${path}`, {
      method,
      headers: { authorization: `Bearer ${token}`, 'content-type': 'application/json', ...headers },
      ...(body === undefined ? {} : { body: JSON.stringify(body) }),
    });
    return { status: response.status, headers: response.headers, text: await response.text() };
  };
  const registered = await call(
    `/v1/chips/${CHIP}`,
    'PUT',
    { model: inventedChip() },
    { 'if-none-match': '*' },
  );
  if (registered.status !== 201) throw new Error(`chip: ${registered.status} ${registered.text}`);
  const asked = requestBody(CHIP, 12.5);
  const made = await call('/v1/design-requests', 'POST', asked, { prefer: 'wait=60' });
  if (made.status !== 200) throw new Error(`design: ${made.status} ${made.text}`);
  const { id, hash } = JSON.parse(made.text) as { id: string; hash: string };
  const release = await publish({ call }, id);
  return {
    ...{ api, bare, token, chip: CHIP, call },
    stored: { body: JSON.stringify(asked), id: hash },
    release: { ...release, versionId: await versionIdOf(databaseUrl) },
  };
}

/** Ten seconds. Everything lives in a temporary folder that `stop` removes. */
export async function startServices(): Promise<Services> {
  const folder = mkdtempSync(join(tmpdir(), 'ringbinder-bench-'));
  // As root the database runs as another user, who must be able to pass.
  chmodSync(folder, 0o755);
  const quiet = { info: () => {}, warn: () => {} };
  const closers: (() => Promise<void>)[] = [async () => rmSync(folder, { recursive: true, force: true })];
  const stop = async (): Promise<void> => {
    for (let close = closers.pop(); close !== undefined; close = closers.pop()) await close();
  };
  try {
    const database = await startEmbedded({ folder: join(folder, 'postgres'), logger: quiet });
    closers.push(() => database.stop());
    const { token } = generateToken();
    const environment = {
      ...{ DATABASE_URL: database.url, RINGBINDER_ADMIN_TOKEN: token },
      ...{ PORT: '0', HOST: '127.0.0.1', RINGBINDER_RATE_PER_S: RATE_PER_S },
    };
    const run = (file: string): Started => {
      const started = start(file, folder, environment);
      closers.push(() => started.stop());
      return started;
    };
    const [api, worker, bare] = [run('server/api'), run('server/worker'), run('test/bench/bare-server')];
    const apiUrl = await api.says(/REST +(http:\/\/\S+)\/v1/);
    const bareUrl = await bare.says(/listening on (http:\/\/\S+)/);
    await worker.says(/worker ready/);
    return { ...(await prepare(apiUrl, bareUrl, token, database.url)), stop };
  } catch (error) {
    await stop();
    throw error;
  }
}
