import { cp, mkdir, mkdtemp, rm, writeFile } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import pg from 'pg';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { migrate } from '../../../server/store/migrate.ts';
import { createTestDatabase, type TestDatabase } from '../../support/postgres.ts';

describe('migrations', () => {
  let database: TestDatabase;
  let folder: string;
  const query = async (sql: string) => {
    const client = new pg.Client({ connectionString: database.url });
    await client.connect();
    try {
      return (await client.query(sql)).rows as Record<string, unknown>[];
    } finally {
      await client.end();
    }
  };

  beforeAll(async () => {
    database = await createTestDatabase('empty');
    folder = await mkdtemp(join(tmpdir(), 'ringbinder-migrations-'));
    await cp('prisma/migrations', folder, { recursive: true });
  });
  afterAll(async () => {
    await database.drop();
    await rm(folder, { recursive: true, force: true });
  });

  it('four processes starting at once apply each migration exactly once', async () => {
    const applied = await Promise.all([1, 2, 3, 4].map(() => migrate(database.url, folder)));
    expect(applied.flat()).toEqual(['20261201120000_main']);
    expect(await query('select migration_name, applied_steps_count from _prisma_migrations')).toEqual([
      { migration_name: '20261201120000_main', applied_steps_count: 1 },
    ]);
    expect(await query("select to_regclass('graphile_worker.jobs') is not null as ready")).toEqual([
      { ready: true },
    ]);
  });

  it('a second run does nothing', async () => {
    expect(await migrate(database.url, folder)).toEqual([]);
  });

  it('a migration that fails changes nothing, and blocks later runs with its reason', async () => {
    await mkdir(join(folder, '20990101000000_broken'));
    await writeFile(
      join(folder, '20990101000000_broken', 'migration.sql'),
      'create table half_done (id int); select 1/0;',
    );
    await expect(migrate(database.url, folder)).rejects.toThrow('division by zero');
    expect(await query("select to_regclass('half_done') is null as absent")).toEqual([{ absent: true }]);
    await expect(migrate(database.url, folder)).rejects.toThrow(
      /20990101000000_broken failed earlier.*division by zero/,
    );
    await query("delete from _prisma_migrations where migration_name = '20990101000000_broken'");
    await rm(join(folder, '20990101000000_broken'), { recursive: true });
  });

  it('a migration edited after it was applied is refused', async () => {
    await writeFile(join(folder, '20261201120000_main', 'migration.sql'), 'select 1;');
    await expect(migrate(database.url, folder)).rejects.toThrow('edited after it was applied');
  });
});
