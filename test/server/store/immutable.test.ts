import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { problemOf } from '../../../server/problem-error.ts';
import {
  type Library,
  makeChip,
  makeDesign,
  openLibrary,
  questionOf,
  saveVersion,
  sha256,
  submit,
  type TestChip,
} from '../../support/library.ts';

const TABLES = ['chip_revision', 'design', 'refusal', 'configuration_version', 'release', 'history'] as const;
/** SQLSTATE restrict_violation, check_violation, foreign_key_violation. */
const REFUSED = { code: '23001' };
const BROKEN_RULE = { code: '23514' };
const REFERENCED = { code: '23503' };

describe('what the database itself refuses', () => {
  let library: Library;
  let on: TestChip;
  let designId: string;

  beforeAll(async () => {
    library = await openLibrary();
    on = await makeChip(library, 'I-1');
    designId = (await makeDesign(library, questionOf(on, 'design'))).id;
    const version = await saveVersion(library, on, 'il50', designId);
    await library.store.publishRelease(library.by, {
      chipId: on.chip.id,
      name: 'current',
      versionId: version.id,
      note: '',
      accepted: [],
    });
    const request = await submit(library, questionOf(on, 'refused'));
    const started = await library.store.startComputation(request.computationId!);
    await library.store.refuseComputation(started!.id, 1, problemOf('SPECIFICATION_UNREACHABLE', 'invented'));
  });
  afterAll(() => library.close());

  it.each(TABLES)('%s: no update, no delete, no truncate, not even in the replica role', async (table) => {
    const [count] = await library.query(`select count(*)::int as n from ${table}`);
    expect(count!.n).toBeGreaterThan(0);
    const session = await library.session();
    const column =
      table === 'history'
        ? 'action'
        : table === 'design'
          ? 'architecture'
          : table === 'refusal'
            ? 'canonical'
            : 'note';
    for (const role of ['origin', 'replica']) {
      await session.query(`set session_replication_role = ${role}`);
      await expect(session.query(`update ${table} set ${column} = 'x'`)).rejects.toMatchObject(REFUSED);
      await expect(session.query(`delete from ${table}`)).rejects.toMatchObject(REFUSED);
      await expect(session.query(`truncate ${table} cascade`)).rejects.toMatchObject(REFUSED);
    }
    expect(await library.query(`select count(*)::int as n from ${table}`)).toEqual([count]);
  });

  it('retention, said so in its transaction, may delete a design nobody refers to, and no other', async () => {
    const ask = questionOf(on, 'forgotten');
    const request = await submit(library, ask);
    const session = await library.session();
    await session.query(
      `insert into design (id, canonical, chip_id, chip_revision_id, engine, architecture, filter_order, met, result, result_hash)
       values ($1, $2, $3, $4, '1', 'ALL_PASS_PAIR', 1, true, '{}', $5)`,
      [ask.key, ask.canonical, on.chip.id, on.revision.id, sha256('r')],
    );
    await session.query('begin');
    await session.query("set local ringbinder.retention = 'on'");
    expect((await session.query('delete from design where id = $1', [ask.key])).rowCount).toBe(1);
    await expect(session.query('update design set met = false')).rejects.toMatchObject(REFUSED);
    await session.query('rollback');
    await session.query('begin');
    await session.query("set local ringbinder.retention = 'on'");
    await expect(session.query('delete from design where id = $1', [designId])).rejects.toMatchObject(
      REFERENCED,
    );
    await session.query('rollback');
    await expect(session.query('delete from design where id = $1', [ask.key])).rejects.toMatchObject(REFUSED);
    await library.store.cancelRequest(library.by, request.id);
  });

  it('an address that is not the SHA-256 of its text', async () => {
    const insert = (table: string, address: string) =>
      library.query(
        `insert into ${table} (${address}, canonical, problem) values ($1, '{"model":{}}', '{}')`,
        [sha256('x')],
      );
    await expect(insert('refusal', 'id')).rejects.toMatchObject(BROKEN_RULE);
    await expect(
      library.query(
        `insert into chip_revision (id, chip_id, number, hash, canonical, created_by)
         values (gen_random_uuid(), $1, 9, $2, '{"model":{}}', $3)`,
        [on.chip.id, sha256('x'), library.by.actorId],
      ),
    ).rejects.toMatchObject(BROKEN_RULE);
  });

  it('a version of a design made for another revision of the chip', async () => {
    const other = await makeChip(library, 'I-2');
    await expect(
      library.query(
        `insert into configuration_version (id, configuration_id, chip_id, number, chip_revision_id, source_kind, design_id,
           setting, content_hash, created_by)
         select gen_random_uuid(), id, chip_id, 99, $1, 'DESIGN', $2, '{}', 'h', created_by from configuration limit 1`,
        [other.revision.id, designId],
      ),
    ).rejects.toMatchObject(REFERENCED);
  });

  it('a release name that points at nothing, told at commit', async () => {
    const session = await library.session();
    await session.query('begin');
    await session.query('update release_head set sequence = 99 where chip_id = $1', [on.chip.id]);
    await expect(session.query('commit')).rejects.toMatchObject(REFERENCED);
  });

  it('steps that a computation and a request cannot take', async () => {
    const ask = questionOf(on, 'steps');
    await makeDesign(library, ask);
    await expect(
      library.query("update computation set state = 'RUNNING', finished_at = null where key = $1", [ask.key]),
    ).rejects.toMatchObject(REFUSED);
    await expect(
      library.query('update computation set progress = 0.5 where key = $1', [ask.key]),
    ).rejects.toMatchObject(REFUSED);
    await expect(
      library.query("update request set state = 'QUEUED', finished_at = null where key = $1", [ask.key]),
    ).rejects.toMatchObject(REFUSED);
    const request = await submit(library, questionOf(on, 'incomplete'));
    const incomplete = [
      "state = 'DONE', finished_at = now()",
      "state = 'FAILED', finished_at = now()",
      "state = 'CANCELLED', finished_at = now()",
      'finished_at = now()',
      'computation_id = null',
    ];
    for (const change of incomplete) {
      await expect(
        library.query(`update request set ${change} where id = $1`, [request.id]),
      ).rejects.toMatchObject(BROKEN_RULE);
    }
  });

  it('a history entry whose number is lower than one already seen stays beyond the horizon until it is committed', async () => {
    const late = await library.session();
    const insert =
      "insert into history (actor_id, action, subject_kind, subject_id) values ($1, 'x', 'Chip', 'y') returning id";
    await late.query('begin');
    const first = (await late.query<{ id: string }>(insert, [library.by.actorId])).rows[0]!.id;
    const second = (await library.query<{ id: string }>(insert, [library.by.actorId]))[0]!.id;
    expect(BigInt(first)).toBeLessThan(BigInt(second));
    const settled = () =>
      library.query(
        'select id from history where id in ($1, $2) and tx < pg_snapshot_xmin(pg_current_snapshot())',
        [first, second],
      );
    expect(await settled()).toEqual([]);
    await late.query('commit');
    expect(await settled()).toHaveLength(2);
  });
});
