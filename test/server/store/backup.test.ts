import { execFile } from 'node:child_process';
import { mkdtemp, readFile, rm, stat, writeFile } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { Readable, Writable } from 'node:stream';
import { promisify } from 'node:util';
import { gunzipSync, gzipSync } from 'node:zlib';
import pg from 'pg';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { problemOf } from '../../../server/problem-error.ts';
import { BackupUnreadable, backup, createStore, restore } from '../../../server/store/index.ts';
import {
  LIMITS,
  type Library,
  makeChip,
  makeDesign,
  openLibrary,
  questionOf,
  reviseAsk,
  saveVersion,
  submit,
} from '../../support/library.ts';
import { createTestDatabase, type TestDatabase } from '../../support/postgres.ts';

const run = promisify(execFile);

/** Rows and their content by PostgreSQL's own hash, `history.tx` apart: it counts the transactions of one cluster. */
const CONTENT = [
  'actor',
  'token',
  'token_use',
  'bootstrap',
  'chip',
  'chip_revision',
  'computation',
  'design',
  'refusal',
  'request',
  'idempotency',
  'configuration',
  'configuration_version',
  'release',
  'release_head',
  'history',
].map(
  (table) =>
    `select '${table}' as name, count(*)::int as rows, md5(string_agg(line, '|' order by line)) as hash
     from (select (to_jsonb(t) - 'tx')::text as line from ${table} t) lines`,
);

async function query(url: string, sql: string): Promise<Record<string, unknown>[]> {
  const client = new pg.Client({ connectionString: url });
  await client.connect();
  try {
    return (await client.query(sql)).rows as Record<string, unknown>[];
  } finally {
    await client.end();
  }
}

const contentOf = (url: string) => query(url, CONTENT.join(' union all '));

async function bytesOf(url: string): Promise<Buffer> {
  const chunks: Buffer[] = [];
  const output = new Writable({
    write(chunk: Buffer, _encoding, done) {
      chunks.push(chunk);
      done();
    },
  });
  await backup(url, output);
  return Buffer.concat(chunks);
}

describe('backup and restore', () => {
  let library: Library;
  let saved: Buffer;
  const databases: TestDatabase[] = [];
  const fresh = async (kind: 'migrated' | 'empty' = 'empty') => {
    const database = await createTestDatabase(kind);
    databases.push(database);
    return database.url;
  };

  beforeAll(async () => {
    library = await openLibrary();
    const { store, by } = library;
    await store.bootstrapAdmin({ lookup: 'abcdefghijkl', secretHash: Buffer.alloc(32, 200) });
    await store.noteTokenUse(by.tokenId!);
    const on = await makeChip(library, 'B-1');
    const design = await makeDesign(library, questionOf(on, 'designed'));
    const version = await saveVersion(library, on, 'il50', design.id);
    const ask = {
      chipId: on.chip.id,
      name: 'current',
      versionId: version.id,
      note: 'line\u2028 "quoted" \\ ü',
      accepted: ['A'],
    };
    await store.publishRelease(by, ask);
    await store.publishRelease(by, ask, { key: 'k', operation: 'publishRelease', fingerprint: 'f' });
    const refused = await submit(library, questionOf(on, 'refused'));
    const started = await store.startComputation(refused.computationId!);
    await store.refuseComputation(started!.id, 1, problemOf('SPECIFICATION_UNREACHABLE', 'invented'));
    await submit(library, questionOf(on, 'waiting'));
    const running = await submit(library, questionOf(on, 'running'));
    await store.startComputation(running.computationId!);
    await store.reportProgress(running.computationId!, 1, 0.1);
    await store.reviseChip(by, reviseAsk(on.chip, 1, 0.1 + 0.2));
    saved = await bytesOf(library.database.url);
  });
  afterAll(async () => {
    await library.close();
    for (const database of databases) await database.drop();
  });

  it('a restored library equals the original: every table, every row, and goes on from there', async () => {
    const url = await fresh();
    const rows = await restore(url, Readable.from([saved]));
    const before = await contentOf(library.database.url);
    expect(before.every((table) => Number(table.rows) > 0)).toBe(true);
    expect(await contentOf(url)).toEqual(before);
    expect(Object.values(rows).reduce((sum, n) => sum + n)).toBe(
      before.reduce((sum, table) => sum + Number(table.rows), 0),
    );

    const store = await createStore({ databaseUrl: url });
    const pulled = await store.findRelease('B-1', 'current');
    expect(pulled).toEqual(await library.store.findRelease('B-1', 'current'));
    expect(await store.findToken('abcdefghijkl')).toEqual(await library.store.findToken('abcdefghijkl'));
    expect(await store.bootstrapAdmin({ lookup: 'bcdefghijklm', secretHash: Buffer.alloc(32) })).toBe(false);
    const chip = (await store.findChip('B-1'))!;
    expect(await store.reviseChip(library.by, reviseAsk(chip, 2, 77))).toMatchObject({ outcome: 'WRITTEN' });
    await store.close();
  });

  it('what was waiting or running is queued again', async () => {
    const url = await fresh();
    await restore(url, Readable.from([saved]));
    const live = "select c.id from computation c where state in ('QUEUED','RUNNING') order by c.id";
    const jobs = 'select j.key::uuid as id from graphile_worker.jobs j where attempts = 0 order by 1';
    expect(await query(url, live)).toHaveLength(2);
    expect(await query(url, jobs)).toEqual(await query(url, live));
  });

  it('what never changes cannot be changed in the restored one either', async () => {
    const url = await fresh();
    await restore(url, Readable.from([saved]));
    for (const table of [
      'chip_revision',
      'design',
      'refusal',
      'configuration_version',
      'release',
      'history',
    ]) {
      await expect(query(url, `delete from ${table}`)).rejects.toMatchObject({ code: '23001' });
      await expect(query(url, `truncate ${table} cascade`)).rejects.toMatchObject({ code: '23001' });
    }
    await expect(query(url, "update history set action = 'x'")).rejects.toMatchObject({ code: '23001' });
    // Entries of a copy are settled in the new cluster, whose transactions are counted anew.
    const hidden = 'select id from history where tx >= pg_snapshot_xmin(pg_current_snapshot())';
    await expect.poll(() => query(url, hidden)).toEqual([]);
  });

  it('a database that holds anything is left alone', async () => {
    const before = await contentOf(library.database.url);
    await expect(restore(library.database.url, Readable.from([saved]))).rejects.toThrow('not empty');
    expect(await contentOf(library.database.url)).toEqual(before);
  });

  it('a file that is cut off, changed, of a newer version or no backup at all is refused whole', async () => {
    const url = await fresh('migrated');
    const text = gunzipSync(saved).toString('utf8');
    const lines = text.split('\n');
    const wrong: readonly [string, Buffer][] = [
      ['cut off in the middle of its bytes', saved.subarray(0, saved.length >> 1)],
      ['without its last lines', gzipSync(lines.slice(0, -5).join('\n'))],
      [
        'with a changed name',
        gzipSync(text.replace('invented-designer', 'invented-changed!'.replace('!', 'r'))),
      ],
      ['of a newer version', gzipSync(text.replace('_main"', '_main","20990101000000_later"'))],
      ['of unknown columns', gzipSync(text.replace('"columns":["id","kind"', '"columns":["id","unknown"'))],
      ['not ours', gzipSync('{"hello":"world"}\n')],
      ['not even compressed', Buffer.from('hello')],
      ['empty', Buffer.alloc(0)],
    ];
    for (const [what, bytes] of wrong) {
      await expect(restore(url, Readable.from([bytes])), what).rejects.toBeInstanceOf(BackupUnreadable);
      expect(await query(url, 'select 1 from actor'), what).toEqual([]);
    }
  });

  it('is of one moment while the library is written to', async () => {
    const on = await makeChip(library, 'B-2');
    let writing = true;
    const writer = (async () => {
      for (let index = 0; writing; index++)
        await library.store.submitRequest(library.by, questionOf(on, `busy-${index}`), LIMITS);
    })();
    try {
      for (let round = 0; round < 5; round++) {
        const url = await fresh();
        await restore(url, Readable.from([await bytesOf(library.database.url)]));
        const torn = `select id from computation c where state in ('QUEUED','RUNNING') and waiters <>
          (select count(*) from request r where r.computation_id = c.id and r.state in ('QUEUED','RUNNING'))`;
        expect(await query(url, torn)).toEqual([]);
      }
    } finally {
      writing = false;
      await writer;
    }
  });

  it('as commands: a file for its owner alone, never overwritten, restored into an empty database', async () => {
    const folder = await mkdtemp(join(tmpdir(), 'ringbinder-backup-'));
    const file = join(folder, 'library.gz');
    const command = (script: string, url: string) =>
      run(process.execPath, ['--import', 'tsx', `scripts/${script}.ts`, file], {
        env: { ...process.env, DATABASE_URL: url },
      });
    try {
      expect((await command('backup', library.database.url)).stdout).toContain('release 2');
      expect((await stat(file)).mode & 0o077).toBe(0);
      const bytes = await readFile(file);
      await expect(command('backup', library.database.url)).rejects.toMatchObject({
        code: 1,
        stderr: expect.stringMatching(/^no backup: EEXIST: .*\n$/),
      });
      expect(await readFile(file)).toEqual(bytes);
      const url = await fresh();
      expect((await command('restore', url)).stdout).toContain('release 2');
      await expect(command('restore', url)).rejects.toMatchObject({
        code: 1,
        stderr: expect.stringContaining('not empty'),
      });
      await writeFile(file, 'broken');
      await expect(command('restore', await fresh())).rejects.toMatchObject({ code: 1 });
    } finally {
      await rm(folder, { recursive: true, force: true });
    }
  });
});
