import type { Database } from '../database.ts';
import type { Who } from '../store.ts';

/** At most one write a minute and token, also with many processes: the condition stands in the statement. */
export const noteTokenUse =
  (database: Database): Who['noteTokenUse'] =>
  async (id) => {
    await database.pool.query({
      name: 'note-token-use',
      text: `insert into token_use as u (token_id, last_used_at) values ($1, now())
             on conflict (token_id) do update set last_used_at = excluded.last_used_at
             where u.last_used_at < now() - interval '1 minute'`,
      values: [id],
    });
  };
