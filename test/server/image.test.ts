/**
 * The image without a builder of images: what the last stage of the Dockerfile copies, laid out in a folder, and there the
 * commands of the Dockerfile and of docker-compose.yml. Nothing of this checkout is within their reach but the packages
 * that `npm ci --omit=dev --omit=optional` leaves.
 */
import { type ChildProcess, execFile, spawn } from 'node:child_process';
import { once } from 'node:events';
import { cp, mkdir, mkdtemp, readdir, readFile, rm, stat, symlink } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { basename, dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { promisify } from 'node:util';
import { afterAll, beforeAll, describe, expect, it, vi } from 'vitest';
import { createTestDatabase, type TestDatabase } from '../support/postgres.ts';
import { inventedChip } from './rest/invented-chips.ts';

const ROOT = fileURLToPath(new URL('../..', import.meta.url));
const read = (file: string): Promise<string> => readFile(join(ROOT, file), 'utf8');

const START_MS = 30_000;
/** Both pages bring an editor or a reader of a megabyte with them. */
const LEAST_PAGE_BYTES = 500_000;
const TOKEN = `rbt_image0000000_${'i'.repeat(43)}`;

interface Stage {
  readonly copies: readonly {
    readonly from: string | null;
    readonly sources: string[];
    readonly to: string;
  }[];
  readonly environment: Readonly<Record<string, string>>;
  readonly command: readonly string[];
  readonly healthCheck: readonly string[];
}

/** The last stage. Only the forms that our Dockerfile uses are understood; any other line fails the test. */
function lastStage(dockerfile: string): Stage {
  const lines = dockerfile.split('\n').filter((line) => line !== '' && !line.startsWith('#'));
  const first = lines.findLastIndex((line) => line.startsWith('FROM '));
  const copies: { from: string | null; sources: string[]; to: string }[] = [];
  let environment: Record<string, string> = {};
  let command: string[] = [];
  let healthCheck: string[] = [];
  for (const line of lines.slice(first + 1)) {
    const [instruction = '', ...words] = line.split(' ');
    if (instruction === 'COPY') {
      const from = /^--from=(.*)$/.exec(words[0]!)?.[1] ?? null;
      const paths = from === null ? words : words.slice(1);
      copies.push({ from, sources: paths.slice(0, -1), to: paths.at(-1)! });
    } else if (instruction === 'ENV') environment = Object.fromEntries(words.map((word) => word.split('=')));
    else if (instruction === 'CMD') command = JSON.parse(words.join(' '));
    else if (instruction === 'HEALTHCHECK') healthCheck = JSON.parse(/ CMD (.*)$/.exec(line)![1]!);
    else expect(['WORKDIR', 'RUN', 'USER', 'EXPOSE', 'STOPSIGNAL']).toContain(instruction);
  }
  return { copies, environment, command, healthCheck };
}

/** `a/*.b` as the files it stands for, with COPY's rule that a folder gives its content and a file keeps its name. */
async function copyInto(root: string, source: string, to: string, image: string): Promise<void> {
  if (source.includes('*')) {
    const suffix = basename(source).replace('*', '');
    const names = (await readdir(join(root, dirname(source)))).filter((name) => name.endsWith(suffix));
    expect(names, source).not.toEqual([]);
    for (const name of names) await copyInto(root, join(dirname(source), name), to, image);
    return;
  }
  const isFolder = (await stat(join(root, source))).isDirectory();
  const target = isFolder || !to.endsWith('/') ? to : join(to, basename(source));
  await cp(join(root, source), join(image, target), { recursive: true });
}

/** Links to the packages that production has, as the lock file marks them. What they need themselves is beside them. */
async function linkPackages(image: string): Promise<number> {
  interface Locked {
    readonly dev?: boolean;
    readonly optional?: boolean;
    readonly devOptional?: boolean;
  }
  const { packages } = JSON.parse(await read('package-lock.json')) as { packages: Record<string, Locked> };
  const kept = Object.entries(packages).filter(
    ([path, { dev, optional, devOptional }]) =>
      /^node_modules\/(@[^/]+\/)?[^/]+$/.test(path) && !dev && !optional && !devOptional,
  );
  for (const [path] of kept) {
    await mkdir(dirname(join(image, path)), { recursive: true });
    await symlink(join(ROOT, path), join(image, path));
  }
  return kept.length;
}

/** `npm run build` into another folder; types are another check's business. */
async function build(target: string): Promise<void> {
  const { scripts } = JSON.parse(await read('package.json')) as { scripts: { build: string } };
  const [program = '', ...args] = scripts.build.split(' ');
  const file = join(ROOT, 'node_modules', '.bin', program);
  await promisify(execFile)(file, [...args, '--noCheck', '--outDir', target], { cwd: ROOT });
}

describe('the image', () => {
  let stage: Stage;
  let image: string;
  let built: string;
  let database: TestDatabase;
  const children: ChildProcess[] = [];

  beforeAll(async () => {
    stage = lastStage(await read('Dockerfile'));
    [image, built] = (await Promise.all(
      ['image', 'built'].map((name) => mkdtemp(join(tmpdir(), `ringbinder-${name}-`))),
    )) as [string, string];
    [database] = await Promise.all([createTestDatabase('empty'), build(join(built, 'app', 'dist'))]);
    for (const { from, sources, to } of stage.copies)
      for (const source of sources) await copyInto(from === null ? ROOT : built, source, to, image);
    expect(await linkPackages(image)).toBeGreaterThan(50);
  });
  afterAll(async () => {
    for (const child of children)
      if (child.exitCode === null && child.signalCode === null) child.kill('SIGKILL');
    await database?.drop();
    for (const folder of [image, built]) await rm(folder, { recursive: true, force: true });
  });

  /** `command` as the container runs it: in the image's folder, with its environment and nothing of ours. */
  function start([program, ...args]: readonly string[], environment: Record<string, string> = {}) {
    expect(program).toBe('node');
    const child = spawn(process.execPath, args, {
      cwd: image,
      env: {
        PATH: process.env.PATH!,
        ...stage.environment,
        ...{ HOST: '127.0.0.1', PORT: '0', DATABASE_URL: database.url, RINGBINDER_ADMIN_TOKEN: TOKEN },
        ...environment,
      },
      stdio: ['ignore', 'pipe', 'pipe'],
    });
    children.push(child);
    let output = '';
    for (const stream of [child.stdout, child.stderr])
      stream.on('data', (chunk: Buffer) => {
        output += chunk.toString();
      });
    const exited = once(child, 'exit');
    return {
      says: (pattern: RegExp): Promise<string> =>
        vi.waitFor(
          () => {
            const found = pattern.exec(output);
            if (found === null) throw new Error(`it never said ${pattern}:\n${output}`);
            return found[1] ?? '';
          },
          { timeout: START_MS, interval: 20 },
        ),
      async end(signal?: NodeJS.Signals): Promise<number | null> {
        if (signal) child.kill(signal);
        await exited;
        return child.exitCode;
      },
      output: () => output,
    };
  }

  it('copies nothing that .dockerignore keeps out', async () => {
    const allowed = (await read('.dockerignore')).split('\n').filter((line) => line.startsWith('!'));
    for (const { from, sources } of stage.copies)
      if (from === null) for (const source of sources) expect(allowed).toContain(`!${source.split('/')[0]}`);
  });

  it('serves its pages, computes a design in the worker beside it, is healthy by its own check, and ends at SIGTERM', async () => {
    const compose = await read('docker-compose.yml');
    const commandOf = (name: string): string[] =>
      new RegExp(`^ {2}${name}:\\n(?: {4}.*\\n)*? {4}command: \\[(.*)\\]$`, 'm')
        .exec(compose)![1]!
        .split(', ');
    expect(commandOf('api')).toEqual(stage.command);
    const heartbeat = join(image, 'alive');
    const api = start(stage.command);
    const worker = start(commandOf('worker'), { RINGBINDER_THREADS: '1', RINGBINDER_HEARTBEAT: heartbeat });
    const url = await api.says(/REST +(http:\/\/\S+)\/v1/);

    expect((await fetch(`${url}/healthz`)).status).toBe(200);
    expect((await fetch(`${url}/readyz`)).status).toBe(200);
    for (const path of ['/graphiql', '/docs/']) {
      const page = await fetch(`${url}${path}`);
      expect([path, page.status, page.headers.get('content-type')]).toEqual([
        path,
        200,
        expect.stringMatching(/^text\/html/),
      ]);
      const parts = [...(await page.text()).matchAll(/<(?:script|link)[^>]*? (?:src|href)="([^"]+)"/g)];
      let bytes = 0;
      for (const [, part = ''] of parts) {
        const answer = await fetch(new URL(part, `${url}${path}`));
        expect([part, answer.status]).toEqual([part, 200]);
        bytes += (await answer.arrayBuffer()).byteLength;
      }
      expect(bytes, path).toBeGreaterThan(LEAST_PAGE_BYTES);
    }

    const send = (method: string, path: string, body: unknown, headers: Record<string, string>) =>
      fetch(`${url}${path}`, {
        method,
        headers: { authorization: `Bearer ${TOKEN}`, 'content-type': 'application/json', ...headers },
        body: JSON.stringify(body),
      });
    const chip = { description: 'invented', model: inventedChip() };
    expect((await send('PUT', '/v1/chips/IMG-1', chip, { 'if-none-match': '*' })).status).toBe(201);
    await worker.says(/worker ready/);
    const specification = {
      family: {
        family: 'BUTTERWORTH',
        shape: 'LOW_PASS',
        order: 1,
        band: { offsetGhz: { low: -6, high: 6 } },
      },
    };
    const asked = await send(
      'POST',
      '/v1/design-requests',
      { chip: 'IMG-1', specification },
      { prefer: 'wait=20' },
    );
    expect(asked.status).toBe(200);
    expect(await asked.json()).toMatchObject({ family: 'BUTTERWORTH', order: 1, chip: 'IMG-1' });

    const checks = [
      start(stage.healthCheck, { PORT: new URL(url).port }),
      start(stage.healthCheck, { RINGBINDER_HEARTBEAT: heartbeat }),
    ];
    expect(await Promise.all(checks.map((check) => check.end()))).toEqual([0, 0]);
    expect(await Promise.all([api.end('SIGTERM'), worker.end('SIGTERM')])).toEqual([0, 0]);
    for (const { output } of [api, worker]) expect(output()).not.toMatch(/"level":[56]0/);
  });
});
