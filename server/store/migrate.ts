/**
 * Applies prisma/migrations with the driver alone, keeping Prisma Migrate's table, checksums and advisory lock, so that
 * its own tools can take over. Any number of processes may start at once: one applies, the others wait and find it done.
 */
import { createHash, randomUUID } from 'node:crypto';
import { readdir, readFile } from 'node:fs/promises';
import { join } from 'node:path';
import { Logger, makeWorkerUtils } from 'graphile-worker';
import pg from 'pg';
import { connectionOf } from './connection.ts';
import { findMigrations } from './migrations-folder.ts';

/** The key that Prisma Migrate takes. */
const LOCK_KEY = 72_707_369;

const TABLE = `create table if not exists _prisma_migrations (
  id varchar(36) primary key not null, checksum varchar(64) not null, finished_at timestamptz,
  migration_name varchar(255) not null, logs text, rolled_back_at timestamptz,
  started_at timestamptz not null default now(), applied_steps_count integer not null default 0)`;

interface AppliedRow {
  migration_name: string;
  checksum: string;
  finished_at: Date | null;
  logs: string | null;
}

async function readApplied(client: pg.Client): Promise<Map<string, string>> {
  await client.query(TABLE);
  const { rows } = await client.query<AppliedRow>(
    'select migration_name, checksum, finished_at, logs from _prisma_migrations where rolled_back_at is null order by started_at',
  );
  const failed = rows.find((row) => row.finished_at === null);
  if (failed) {
    throw new Error(`migration ${failed.migration_name} failed earlier: ${failed.logs ?? 'no log'}`);
  }
  return new Map(rows.map((row) => [row.migration_name, row.checksum]));
}

async function apply(client: pg.Client, name: string, sql: Buffer, checksum: string): Promise<void> {
  const id = randomUUID();
  await client.query('insert into _prisma_migrations (id, checksum, migration_name) values ($1, $2, $3)', [
    id,
    checksum,
    name,
  ]);
  try {
    // One simple query is one implicit transaction: all of it or nothing.
    await client.query(sql.toString('utf8'));
  } catch (error) {
    await client.query('update _prisma_migrations set logs = $2 where id = $1', [id, String(error)]);
    throw error;
  }
  await client.query(
    'update _prisma_migrations set finished_at = now(), applied_steps_count = 1 where id = $1',
    [id],
  );
}

/** The queue's own schema, under the same lock: two first starts at once collide inside it otherwise. */
async function migrateQueue(databaseUrl: string): Promise<void> {
  const pool = new pg.Pool({ ...connectionOf(databaseUrl), max: 2 });
  pool.on('error', () => {});
  pool.on('connect', (connection) => connection.on('error', () => {}));
  try {
    const queue = await makeWorkerUtils({ pgPool: pool, logger: new Logger(() => () => {}) });
    await queue.migrate();
    await queue.release();
  } finally {
    await pool.end();
  }
}

/**
 * Brings a database up to date and answers the names of the migrations applied now.
 * @throws Error when a migration failed earlier, was edited after it was applied, or fails now.
 */
export async function migrate(
  databaseUrl: string,
  folder: string = findMigrations(),
): Promise<readonly string[]> {
  const client = new pg.Client(connectionOf(databaseUrl));
  client.on('error', () => {});
  await client.connect();
  try {
    await client.query('select pg_advisory_lock($1)', [LOCK_KEY]);
    const done = await readApplied(client);
    const applied: string[] = [];
    const entries = await readdir(folder, { withFileTypes: true });
    for (const name of entries
      .filter((entry) => entry.isDirectory())
      .map((entry) => entry.name)
      .sort()) {
      const sql = await readFile(join(folder, name, 'migration.sql'));
      const checksum = createHash('sha256').update(sql).digest('hex');
      const known = done.get(name);
      if (known !== undefined && known !== checksum) {
        throw new Error(`migration ${name} was edited after it was applied`);
      }
      if (known !== undefined) continue;
      await apply(client, name, sql, checksum);
      applied.push(name);
    }
    await migrateQueue(databaseUrl);
    return applied;
  } finally {
    // Ends the session, and the lock with it.
    await client.end();
  }
}
