import { createHash } from 'node:crypto';
import type { Readable } from 'node:stream';
import { createGunzip } from 'node:zlib';
import pg from 'pg';
import { connectionOf } from '../connection.ts';
import { migrate } from '../migrate.ts';
import {
  BackupUnreadable,
  COLUMNS,
  FORMAT,
  type Header,
  MIGRATIONS,
  TABLES,
  type TableHeader,
  type Trailer,
} from './format.ts';

/** A batch stays far below what one parameter may hold (1 GiB) and what a small machine has. */
const BATCH_ROWS = 200;
const BATCH_CHARACTERS = 4_000_000;

type Meta = Header | TableHeader | Trailer;

function metaOf(line: string): Meta {
  try {
    return JSON.parse(line.slice(1)) as Meta;
  } catch (cause) {
    throw new BackupUnreadable('the file is not a backup of this service', { cause });
  }
}

async function assertEmpty(client: pg.Client): Promise<void> {
  for (const table of TABLES) {
    const { rowCount } = await client.query(`select 1 from ${table} limit 1`);
    if (rowCount) throw new Error(`the database is not empty (${table}): restore into a new one`);
  }
}

async function assertKnown(client: pg.Client, header: Header): Promise<void> {
  if (header.backup !== FORMAT) throw new BackupUnreadable('the file is not a backup of this service');
  const { rows } = await client.query<{ name: string }>(MIGRATIONS);
  const unknown = header.migrations.filter((name) => !rows.some((row) => row.name === name));
  if (unknown.length > 0) {
    throw new BackupUnreadable(`the backup is of a newer version: this one lacks ${unknown.join(', ')}`);
  }
}

async function insert(
  client: pg.Client,
  { table, columns }: TableHeader,
  lines: readonly string[],
): Promise<void> {
  const list = columns.map((column) => pg.escapeIdentifier(column)).join(', ');
  await client.query(
    `insert into ${table} (${list}) overriding system value
     select ${list} from jsonb_populate_recordset(null::${table}, $1::jsonb)`,
    [`[${lines.join(',')}]`],
  );
}

async function assertTable(client: pg.Client, header: TableHeader): Promise<void> {
  if (!TABLES.includes(header.table))
    throw new BackupUnreadable(`the backup has an unknown table ${header.table}`);
  const { rows } = await client.query<{ name: string }>(COLUMNS, [header.table]);
  const unknown = header.columns.filter((name) => !rows.some((row) => row.name === name));
  if (unknown.length > 0) throw new BackupUnreadable(`${header.table} has no ${unknown.join(', ')}`);
}

/** Ends lines at \n alone: `node:readline` also ends them at U+2028, which may stand in a note. */
async function* linesOf(input: Readable): AsyncGenerator<string> {
  let rest = '';
  for await (const chunk of input.setEncoding('utf8')) {
    const lines = (rest + String(chunk)).split('\n');
    rest = lines.pop() ?? '';
    yield* lines;
  }
  if (rest !== '') yield rest;
}

/** Reads to the trailer and checks it: a file that was cut off or changed is refused as a whole. */
async function load(client: pg.Client, input: Readable): Promise<Trailer['rows']> {
  const unzipped = createGunzip();
  input.on('error', (error) => unzipped.destroy(error)).pipe(unzipped);
  const hash = createHash('sha256');
  const counts: Record<string, number> = {};
  let isFirst = true;
  let table: TableHeader | null = null;
  let batch: string[] = [];
  let characters = 0;
  const flush = async (): Promise<void> => {
    if (table !== null && batch.length > 0) await insert(client, table, batch);
    batch = [];
    characters = 0;
  };
  for await (const line of linesOf(unzipped)) {
    if (line.startsWith('#')) {
      await flush();
      const meta = metaOf(line);
      if (isFirst !== 'backup' in meta)
        throw new BackupUnreadable('the file is not a backup of this service');
      if ('end' in meta) {
        const isWhole =
          meta.sha256 === hash.digest('hex') && JSON.stringify(meta.rows) === JSON.stringify(counts);
        if (!isWhole) throw new BackupUnreadable('the backup was changed or damaged');
        return meta.rows;
      }
      if ('backup' in meta) await assertKnown(client, meta);
      else {
        await assertTable(client, meta);
        table = meta;
        counts[meta.table] = 0;
      }
    } else {
      if (table === null) throw new BackupUnreadable('the file is not a backup of this service');
      counts[table.table] = (counts[table.table] ?? 0) + 1;
      batch.push(line);
      characters += line.length;
      if (batch.length >= BATCH_ROWS || characters >= BATCH_CHARACTERS) await flush();
    }
    hash.update(`${line}\n`);
    isFirst = false;
  }
  throw new BackupUnreadable('the backup is cut off');
}

/** What was live waits again: the queue itself is not in a backup. */
async function enqueueLive(client: pg.Client): Promise<void> {
  await client.query(
    `select graphile_worker.add_job('design/' || engine, json_build_object('id', id), job_key := id::text, max_attempts := 3)
     from computation where state in ('QUEUED','RUNNING')`,
  );
}

/**
 * Fills an empty database from a backup, all or nothing. The schema is made first where it is missing.
 * @returns rows by table
 * @throws BackupUnreadable for a file that is none, is damaged, or comes from a newer version; Error when the database holds anything
 */
export async function restore(databaseUrl: string, input: Readable): Promise<Trailer['rows']> {
  await migrate(databaseUrl);
  const client = new pg.Client(connectionOf(databaseUrl));
  client.on('error', () => {});
  await client.connect();
  try {
    await client.query('begin');
    await assertEmpty(client);
    const rows = await load(client, input).catch((error: unknown) => {
      const isZip = error instanceof Error && 'code' in error && String(error.code).startsWith('Z_');
      throw isZip ? new BackupUnreadable('the backup is cut off, damaged or none', { cause: error }) : error;
    });
    await client.query(
      `select setval(pg_get_serial_sequence('history', 'id'), coalesce(max(id), 1), max(id) is not null) from history`,
    );
    await enqueueLive(client);
    await client.query('commit');
    return rows;
  } finally {
    input.destroy();
    await client.end();
  }
}
