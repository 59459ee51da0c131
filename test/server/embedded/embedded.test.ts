import { type ChildProcess, fork } from 'node:child_process';
import { once } from 'node:events';
import { chmod, mkdir, mkdtemp, readFile, rm, stat, writeFile } from 'node:fs/promises';
import { createServer } from 'node:net';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import pg from 'pg';
import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import { type Embedded, type EmbeddedOptions, startEmbedded } from '../../../server/embedded/index.ts';

const isRoot = process.getuid?.() === 0;

describe('the embedded PostgreSQL', () => {
  let folder: string;
  let said: string[];
  let servers: Embedded[];
  let children: ChildProcess[];

  beforeEach(async () => {
    folder = await mkdtemp(join(tmpdir(), 'ringbinder-embedded-'));
    await chmod(folder, 0o755);
    said = [];
    servers = [];
    children = [];
  });
  afterEach(async () => {
    for (const child of children) if (child.exitCode === null) child.kill('SIGKILL');
    for (const server of servers) await server.stop();
    await rm(folder, { recursive: true, force: true });
  });

  const logger = {
    info: (fields: object, text: string) => void said.push(`${text} ${JSON.stringify(fields)}`),
    warn: (fields: object, text: string) => void said.push(`${text} ${JSON.stringify(fields)}`),
  };
  const start = async (more: Partial<EmbeddedOptions> = {}) => {
    const server = await startEmbedded({ folder: join(folder, 'data'), logger, durable: false, ...more });
    servers.push(server);
    return server;
  };
  const query = async (url: string, sql: string) => {
    const client = new pg.Client({ connectionString: url });
    client.on('error', () => {});
    await client.connect();
    try {
      return (await client.query(sql)).rows as Record<string, unknown>[];
    } finally {
      await client.end();
    }
  };
  const own = async (launcher: 'WRAPPER' | 'CONTROL') => {
    const script = fileURLToPath(new URL('./owner-process.mjs', import.meta.url));
    const child = fork(script, [join(folder, 'data'), launcher], {
      stdio: ['ignore', 'ignore', 'inherit', 'ipc'],
    });
    children.push(child);
    const [message] = (await once(child, 'message')) as [{ url: string; adopted: boolean }];
    return { child, ...message };
  };
  const kill = async (child: ChildProcess) => {
    child.kill('SIGKILL');
    await once(child, 'exit');
  };

  for (const launcher of ['WRAPPER', 'CONTROL'] as const) {
    describe(`started by ${launcher}`, () => {
      it('keeps its data over a stop and a start, syncs to disk, and listens to this machine alone', async () => {
        const first = await start({ launcher, durable: true });
        await query(first.url, 'create table kept as select 42 as answer');
        expect(await query(first.url, 'show fsync')).toEqual([{ fsync: 'on' }]);
        expect(await query(first.url, 'show listen_addresses')).toEqual([{ listen_addresses: '127.0.0.1' }]);
        await first.stop();
        await expect(query(first.url, 'select 1')).rejects.toThrow('ECONNREFUSED');
        const second = await start({ launcher });
        expect(second.adopted).toBe(false);
        expect(await query(second.url, 'select answer from kept')).toEqual([{ answer: 42 }]);
      });

      it('when its owner is killed with -9, the next start on the folder has everything that was committed', async () => {
        const { child, url } = await own(launcher);
        await query(url, 'create table kept as select 42 as answer');
        await kill(child);
        const next = await start({ launcher });
        expect(await query(next.url, 'select answer from kept')).toEqual([{ answer: 42 }]);
        if (launcher === 'CONTROL') {
          // It ran on, and is ours to leave; ended here so that the test leaves nothing.
          expect(next.adopted).toBe(true);
          const [row] = await query(next.url, "select pg_read_file('postmaster.pid') as pid");
          process.kill(Number(String(row?.pid).split('\n')[0]), 'SIGINT');
          await expect
            .poll(() =>
              query(next.url, 'select 1').then(
                () => 'up',
                () => 'down',
              ),
            )
            .toBe('down');
        }
      });
    });
  }

  it('ends cleanly by itself when its owner is killed: the control file says shut down', async () => {
    const { child } = await own('WRAPPER');
    // DBState at byte 16 of pg_control: 6 in production, 1 shut down (PostgreSQL 18, src/include/catalog/pg_control.h).
    const state = async () =>
      (await readFile(join(folder, 'data', 'cluster', 'global', 'pg_control'))).readInt32LE(16);
    expect(await state()).toBe(6);
    await kill(child);
    await expect.poll(state, { timeout: 10_000 }).toBe(1);
  });

  it('stopping it keeps the process alive until it has ended, also when nothing else does', async () => {
    const { child } = await own('WRAPPER');
    child.send('stop');
    const [code] = await once(child, 'exit');
    expect(code).toBe(7);
  });

  it('a second start on the folder adopts the first, and does not stop it', async () => {
    const first = await start();
    const second = await start();
    expect(second).toMatchObject({ adopted: true, port: first.port, url: first.url });
    await second.stop();
    expect(await query(first.url, 'select 1 as up')).toEqual([{ up: 1 }]);
  });

  it('two first starts at once make one cluster, and both get it', async () => {
    const both = await Promise.all([start(), start()]);
    expect(both[0]!.url).toBe(both[1]!.url);
    expect(both.filter((server) => server.adopted)).toHaveLength(1);
  });

  it('asks for a password that only the owner of the data can read, and never logs it', async () => {
    const server = await start();
    const url = new URL(server.url);
    const password = url.password;
    expect(password.length).toBeGreaterThan(20);
    url.password = 'wrong';
    await expect(query(url.href, 'select 1')).rejects.toThrow('password authentication failed');
    const file = await stat(join(server.folder, 'cluster', 'ringbinder.password'));
    expect(file.mode & 0o077).toBe(0);
    expect(said.join()).not.toContain(password);
  });

  it('takes the port asked for, and says what is wrong when somebody else has it', async () => {
    const taken = createServer();
    await new Promise<void>((done) => taken.listen(0, '127.0.0.1', done));
    const address = taken.address();
    const port = address !== null && typeof address === 'object' ? address.port : 0;
    await expect(start({ port })).rejects.toThrow(/address.*in use/i);
    taken.close();
    expect((await start({ port })).port).toBe(port);
  });

  it('does not need durable data where it is told so', async () => {
    const server = await start({ durable: false });
    expect(await query(server.url, 'show fsync')).toEqual([{ fsync: 'off' }]);
  });

  it('clears what a killed first start left, and leaves what it does not know', async () => {
    const data = join(folder, 'data');
    await mkdir(join(data, 'making-abandoned'), { recursive: true });
    const { utimes } = await import('node:fs/promises');
    const old = new Date(Date.now() - 3_600_000);
    await utimes(join(data, 'making-abandoned'), old, old);
    await writeFile(join(data, 'notes.txt'), 'kept');
    await start();
    await expect(stat(join(data, 'making-abandoned'))).rejects.toThrow('ENOENT');
    expect(await readFile(join(data, 'notes.txt'), 'utf8')).toBe('kept');
  });

  it.runIf(isRoot)('as root runs as another user, also where that user cannot enter the folder', async () => {
    await chmod(folder, 0o700);
    const server = await start();
    expect(server.folder).not.toContain(folder);
    expect(said.join()).toContain('another is used');
    const again = await start();
    expect(again).toMatchObject({ adopted: true, folder: server.folder });
    expect((await readFile(join(folder, 'data', 'DATA_IS_ELSEWHERE'), 'utf8')).trim()).toBe(server.folder);
    const owner = await stat(join(server.folder, 'cluster'));
    expect(owner.uid).not.toBe(0);
    await server.stop();
    await rm(server.folder, { recursive: true });
  });
});
