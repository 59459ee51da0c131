/**
 * A backup is gzipped text, one line a row, made by PostgreSQL itself (`to_jsonb`) and given back to it untouched
 * (`jsonb_populate_recordset`), so no number passes through JavaScript. Lines that begin with `#` are ours:
 *
 *     # {"backup": 1, "at": …, "migrations": […]}
 *     # {"table": "actor", "columns": […]}
 *     {…row…}
 *     # {"end": true, "rows": {"actor": 3, …}, "sha256": …}    over everything before it
 *
 * It holds the whole library: people and the hashes of their tokens (keep it as safe as the database), chips, designs,
 * requests, versions, releases, history. Not in it: the queue, whose jobs are made anew for what was live, and the
 * processes that were there.
 */
export const FORMAT = 1;

/** In an order that foreign keys allow; the two pointers that run against it are checked at commit. */
export const TABLES = [
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
  'release_head',
  'release',
  'history',
] as const;

export type Table = (typeof TABLES)[number];

/** Generated ones make themselves. `history.tx` counts transactions of one cluster and means nothing in another: an entry restored is as old as the restore. */
export const COLUMNS = `select a.attname as name from pg_attribute a
  where a.attrelid = $1::text::regclass and a.attnum > 0 and not a.attisdropped and a.attgenerated = ''
    and not ($1 = 'history' and a.attname = 'tx') order by a.attnum`;

export interface Header {
  readonly backup: number;
  readonly at: string;
  readonly migrations: readonly string[];
}

export interface TableHeader {
  readonly table: Table;
  readonly columns: readonly string[];
}

export interface Trailer {
  readonly end: true;
  readonly rows: Readonly<Record<string, number>>;
  readonly sha256: string;
}

export const MIGRATIONS =
  'select migration_name as name from _prisma_migrations where finished_at is not null and rolled_back_at is null order by migration_name';

export class BackupUnreadable extends Error {
  override readonly name = 'BackupUnreadable';
}
