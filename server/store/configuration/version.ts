import { validate as isUuid } from 'uuid';
import { type Database, one, type Transaction } from '../database.ts';
import { pageOf, readAfter, select } from '../page.ts';
import type { VersionRecord } from '../records.ts';
import type { Configurations } from '../store.ts';

/** Columns of a version, as one list for its own queries and for those of releases; aliases v, f, r, c. */
export const VERSION_COLUMNS = `v.id, v.configuration_id as "configurationId", f.name as "configurationName",
    v.chip_id as "chipId", v.number, v.chip_revision_id as "chipRevisionId", r.number as "chipRevisionNumber",
    c.head_revision as "headRevision", v.source_kind as "sourceKind", v.design_id as "designId", v.setting,
    v.content_hash as "contentHash", v.note, v.created_at as "createdAt", v.created_by as "createdBy"`;

export const VERSION_JOINS = `configuration_version v join configuration f on f.id = v.configuration_id
    join chip_revision r on r.id = v.chip_revision_id join chip c on c.id = v.chip_id`;

const FROM = `select ${VERSION_COLUMNS} from ${VERSION_JOINS}`;

export function readVersion(on: Database['pool'] | Transaction, id: string): Promise<VersionRecord | null> {
  return one<VersionRecord>(on, `${FROM} where v.id = $1`, [id]);
}

export const findVersion =
  (database: Database): Configurations['findVersion'] =>
  (configurationId, number) =>
    one<VersionRecord>(database.pool, `${FROM} where v.configuration_id = $1 and v.number = $2`, [
      configurationId,
      number,
    ]);

export const findVersionById =
  (database: Database): Configurations['findVersionById'] =>
  async (id) =>
    isUuid(id) ? readVersion(database.pool, id) : null;

export const findLatestVersions =
  (database: Database): Configurations['findLatestVersions'] =>
  async (configurationIds) => {
    const { rows } = await database.pool.query<VersionRecord>(
      `${FROM} where f.id = any($1::uuid[]) and v.number = f.last_version`,
      [configurationIds.filter((id) => isUuid(id))],
    );
    return rows;
  };

/** Newest first. */
export const listVersions =
  (database: Database): Configurations['listVersions'] =>
  async (configurationId, page) => {
    const rows = select(database, FROM);
    rows.and('v.configuration_id = ?', configurationId);
    const after = readAfter(page, 'count');
    if (after) rows.and('v.number < ?::int', after[0]);
    const read = await rows.read<VersionRecord>('v.number desc', page.first);
    return pageOf(read, page.first, (row) => [row.number]);
  };

export const listVersionsOfDesign =
  (database: Database): Configurations['listVersionsOfDesign'] =>
  async (designId, page) => {
    const rows = select(database, FROM);
    rows.and('v.design_id = ?', designId);
    const after = readAfter(page, 'time', 'uuid');
    if (after) rows.and('(v.created_at, v.id) < (?::timestamptz, ?::uuid)', after[0], after[1]);
    const read = await rows.read<VersionRecord>('v.created_at desc, v.id desc', page.first);
    return pageOf(read, page.first, (row) => [row.createdAt.toISOString(), row.id]);
  };
