/**
 * A database for tests. One throw-away PostgreSQL serves the whole run (global-setup.ts); every test file makes a
 * database of its own from the migrated template and drops it at the end:
 *
 *     const database = await createTestDatabase();
 *     afterAll(() => database.drop());
 */
import { randomUUID } from 'node:crypto';
import pg from 'pg';
import { inject } from 'vitest';

export interface TestDatabase {
  readonly url: string;
  readonly name: string;
  drop(): Promise<void>;
}

declare module 'vitest' {
  export interface ProvidedContext {
    /** URL of the server's maintenance database. */
    postgresUrl: string;
    /** Name of the migrated database that others are made from. */
    templateDatabase: string;
  }
}

export function urlOfDatabase(serverUrl: string, name: string): string {
  const url = new URL(serverUrl);
  url.pathname = `/${name}`;
  return url.href;
}

export async function execute(url: string, ...statements: readonly string[]): Promise<void> {
  const client = new pg.Client({ connectionString: url });
  await client.connect();
  try {
    for (const statement of statements) await client.query(statement);
  } finally {
    await client.end();
  }
}

/** `empty`: without any table, for tests of the migrations themselves. */
export async function createTestDatabase(kind: 'migrated' | 'empty' = 'migrated'): Promise<TestDatabase> {
  const server = inject('postgresUrl');
  const name = `test_${randomUUID().replaceAll('-', '')}`;
  const template = kind === 'migrated' ? ` template ${inject('templateDatabase')}` : '';
  await execute(server, `create database ${name}${template}`);
  return {
    url: urlOfDatabase(server, name),
    name,
    drop: () => execute(server, `drop database if exists ${name} with (force)`),
  };
}
