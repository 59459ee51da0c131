import { VERSION_COLUMNS, VERSION_JOINS } from '../configuration/version.ts';
import { type Database, one, type Transaction } from '../database.ts';
import { pageOf, readAfter, select } from '../page.ts';
import type { ReleaseRecord, VersionRecord } from '../records.ts';
import type { ReleaseHead, Releases } from '../store.ts';

/** A release's columns stand under other names than those of the version, which make up the rest of the row. */
type Row = VersionRecord & {
  chipSerial: string;
  releaseName: string;
  sequence: number;
  current: boolean;
  releaseNote: string;
  accepted: readonly string[];
  releasedAt: Date;
  releasedBy: string;
};

const COLUMNS = `select c.serial as "chipSerial", e.name as "releaseName", e.sequence, h.sequence = e.sequence as current,
    e.note as "releaseNote", e.accepted, e.created_at as "releasedAt", e.created_by as "releasedBy",
    ${VERSION_COLUMNS}`;

const JOINS = `${VERSION_JOINS} join release e on e.version_id = v.id
    join release_head h on h.chip_id = e.chip_id and h.name = e.name`;

const FROM = `${COLUMNS} from ${JOINS}`;

function releaseOf(row: Row): ReleaseRecord {
  const {
    chipSerial,
    releaseName,
    sequence,
    current,
    releaseNote,
    accepted,
    releasedAt,
    releasedBy,
    ...version
  } = row;
  return {
    chipId: version.chipId,
    chipSerial,
    name: releaseName,
    sequence,
    current,
    version,
    note: releaseNote,
    accepted,
    createdAt: releasedAt,
    createdBy: releasedBy,
  };
}

/** What every instrument asks for again and again: prepared, three unique indexes deep. */
export const findRelease =
  (database: Database): Releases['findRelease'] =>
  async (chipSerial, name) => {
    const row = await one<Row>(database.pool, {
      name: 'find-release',
      text: `${FROM} where c.serial = $1 and h.chip_id = c.id and h.name = $2 and e.sequence = h.sequence`,
      values: [chipSerial, name],
    });
    return row && releaseOf(row);
  };

/** Enough to tell whether what an instrument has is still the release: most pulls end here. */
export const findReleaseHead =
  (database: Database): Releases['findReleaseHead'] =>
  (chipSerial, name) =>
    one<ReleaseHead>(database.pool, {
      name: 'find-release-head',
      text: `select c.id as "chipId", h.name, h.sequence, v.content_hash as "contentHash"
        from chip c
        join release_head h on h.chip_id = c.id
        join release e on e.chip_id = h.chip_id and e.name = h.name and e.sequence = h.sequence
        join configuration_version v on v.id = e.version_id
        where c.serial = $1 and h.name = $2`,
      values: [chipSerial, name],
    });

export async function readRelease(
  on: Database['pool'] | Transaction,
  chipId: string,
  name: string,
  sequence: number,
): Promise<ReleaseRecord | null> {
  const row = await one<Row>(on, `${FROM} where e.chip_id = $1 and e.name = $2 and e.sequence = $3`, [
    chipId,
    name,
    sequence,
  ]);
  return row && releaseOf(row);
}

export const findReleaseBySequence =
  (database: Database): Releases['findReleaseBySequence'] =>
  (chipId, name, sequence) =>
    readRelease(database.pool, chipId, name, sequence);

/** Where every release name of the chips points now. */
export const listReleasesOfChips =
  (database: Database): Releases['listReleasesOfChips'] =>
  async (chipIds) => {
    const { rows } = await database.pool.query<Row>(
      `${FROM} where e.chip_id = any($1::uuid[]) and e.sequence = h.sequence order by e.name`,
      [[...chipIds]],
    );
    return rows.map(releaseOf);
  };

export const listReleases =
  (database: Database): Releases['listReleases'] =>
  (chipId) =>
    listReleasesOfChips(database)([chipId]);

/** Newest first. */
export const listReleaseLog =
  (database: Database): Releases['listReleaseLog'] =>
  async (chipId, name, page) => {
    const rows = select(database, FROM);
    rows.and('e.chip_id = ? and e.name = ?', chipId, name);
    const after = readAfter(page, 'count');
    if (after) rows.and('e.sequence < ?::int', after[0]);
    const read = await rows.read<Row>('e.sequence desc', page.first);
    return pageOf(read.map(releaseOf), page.first, (row) => [row.sequence]);
  };

export const listReleasesOfVersions =
  (database: Database): Releases['listReleasesOfVersions'] =>
  async (versionIds) => {
    const { rows } = await database.pool.query<Row>(
      `${FROM} where e.version_id = any($1::uuid[]) order by e.created_at desc, e.name, e.sequence desc`,
      [[...versionIds]],
    );
    return rows.map(releaseOf);
  };

export const listReleasesOfVersion =
  (database: Database): Releases['listReleasesOfVersion'] =>
  (versionId) =>
    listReleasesOfVersions(database)([versionId]);
