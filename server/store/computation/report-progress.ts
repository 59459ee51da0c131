import type { Database } from '../database.ts';
import type { Computations } from '../store.ts';

/**
 * Progress never falls. A report that changes nothing is told from a fenced one by looking, in the same statement.
 * Commits with NOTIFY queue behind one lock of PostgreSQL: hence at most two reports a second and computation.
 */
export const reportProgress =
  (database: Database): Computations['reportProgress'] =>
  async (id, attempt, progress) => {
    const { rows } = await database.pool.query<{ mine: boolean }>({
      name: 'report-progress',
      text: `with risen as (
               update computation set progress = $3 where id = $1 and attempt = $2 and state = 'RUNNING' and progress < $3
               returning id
             ), told as (select pg_notify('computation', id::text) from risen)
             select exists (select 1 from computation where id = $1 and attempt = $2 and state = 'RUNNING') as mine,
               (select count(*) from told)`,
      values: [id, attempt, progress],
    });
    return rows[0]?.mine === true;
  };
