import { createHash } from 'node:crypto';
import { Readable, type Writable } from 'node:stream';
import { pipeline } from 'node:stream/promises';
import { createGzip } from 'node:zlib';
import pg from 'pg';
import { connectionOf } from '../connection.ts';
import {
  COLUMNS,
  FORMAT,
  type Header,
  MIGRATIONS,
  TABLES,
  type Table,
  type TableHeader,
  type Trailer,
} from './format.ts';

const ROWS_AT_A_TIME = 500;

async function* rowsOf(client: pg.Client, table: Table, columns: readonly string[]): AsyncGenerator<string> {
  const list = columns.map((column) => `t.${pg.escapeIdentifier(column)}`).join(', ');
  await client.query(
    `declare backup no scroll cursor for select to_jsonb(r)::text as line from (select ${list} from ${table} t) r`,
  );
  for (;;) {
    const { rows } = await client.query<{ line: string }>(`fetch ${ROWS_AT_A_TIME} from backup`);
    for (const { line } of rows) yield line;
    if (rows.length === 0) break;
  }
  await client.query('close backup');
}

async function* linesOf(client: pg.Client, counts: Record<string, number>): AsyncGenerator<string> {
  const hash = createHash('sha256');
  const written = (line: string): string => {
    hash.update(`${line}\n`);
    return `${line}\n`;
  };
  const migrations = (await client.query<{ name: string }>(MIGRATIONS)).rows.map((row) => row.name);
  const header: Header = { backup: FORMAT, at: new Date().toISOString(), migrations };
  yield written(`# ${JSON.stringify(header)}`);
  for (const table of TABLES) {
    const columns = (await client.query<{ name: string }>(COLUMNS, [table])).rows.map((row) => row.name);
    yield written(`# ${JSON.stringify({ table, columns } satisfies TableHeader)}`);
    counts[table] = 0;
    for await (const line of rowsOf(client, table, columns)) {
      counts[table]++;
      yield written(line);
    }
  }
  const trailer: Trailer = { end: true, rows: counts, sha256: hash.digest('hex') };
  yield `# ${JSON.stringify(trailer)}\n`;
}

/**
 * Writes the library as it stands at one moment; the service may go on meanwhile.
 * @returns rows by table
 */
export async function backup(
  databaseUrl: string,
  output: Writable,
): Promise<Readonly<Record<string, number>>> {
  const client = new pg.Client(connectionOf(databaseUrl));
  client.on('error', () => {});
  await client.connect();
  try {
    await client.query('begin isolation level repeatable read, read only');
    const counts: Record<string, number> = {};
    await pipeline(Readable.from(linesOf(client, counts)), createGzip(), output);
    await client.query('commit');
    return counts;
  } finally {
    await client.end();
  }
}
