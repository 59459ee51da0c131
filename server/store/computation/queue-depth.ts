import type { Database } from '../database.ts';
import type { Computations } from '../store.ts';

export const queueDepth =
  (database: Database): Computations['queueDepth'] =>
  async () => {
    const { rows } = await database.pool.query<{ queued: number; running: number }>(
      `select count(*) filter (where state = 'QUEUED')::int as queued,
         count(*) filter (where state = 'RUNNING')::int as running
       from computation where state in ('QUEUED','RUNNING')`,
    );
    return rows[0] ?? { queued: 0, running: 0 };
  };
