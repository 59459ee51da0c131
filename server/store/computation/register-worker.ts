/**
 * A worker process is alive while its session holds the advisory lock named by its row: the database itself notices a
 * death, however it came, and no clock is compared.
 */
import { randomInt } from 'node:crypto';
import pg from 'pg';
import { connectionOf } from '../connection.ts';
import type { Database } from '../database.ts';
import type { Computations } from '../store.ts';

/** A range of lock keys of our own: this number in the upper half, a random one in the lower. */
const LOCK_RANGE = 4242n << 32n;
const FIRST_DELAY_MS = 100;
const LONGEST_DELAY_MS = 5000;

async function hold(
  database: Database,
  poolIds: readonly string[],
  engine: string,
  lost: () => void,
): Promise<{ client: pg.Client; key: string }> {
  const client = new pg.Client(connectionOf(database.url));
  client.on('error', () => {});
  client.once('end', lost);
  const key = (LOCK_RANGE + BigInt(randomInt(2 ** 32))).toString();
  try {
    await client.connect();
    // The lock before the row: a row without its lock would be taken for a dead worker's at once.
    await client.query('select pg_advisory_lock($1::bigint)', [key]);
    await client.query('insert into worker_process (key, pool_ids, engine) values ($1, $2, $3)', [
      key,
      poolIds,
      engine,
    ]);
    return { client, key };
  } catch (error) {
    client.off('end', lost);
    await client.end().catch(() => {});
    throw error;
  }
}

/** A lost session registers again by itself: meanwhile the jobs may have gone to others, which the fence makes harmless. */
export const registerWorker =
  (database: Database): Computations['registerWorker'] =>
  async (poolIds, engine) => {
    let released = false;
    let timer: NodeJS.Timeout | undefined;
    let held: { client: pg.Client; key: string } | null = null;

    const again = (delayMs: number): void => {
      held = null;
      if (released) return;
      timer = setTimeout(() => {
        hold(database, poolIds, engine, () => again(FIRST_DELAY_MS)).then(
          async (fresh) => {
            held = fresh;
            if (released) await letGo();
          },
          () => again(Math.min(delayMs * 2, LONGEST_DELAY_MS)),
        );
      }, delayMs);
    };
    const letGo = async (): Promise<void> => {
      const last = held;
      held = null;
      if (!last) return;
      await last.client.query('delete from worker_process where key = $1', [last.key]).catch(() => {});
      await last.client.end().catch(() => {});
    };

    held = await hold(database, poolIds, engine, () => again(FIRST_DELAY_MS));
    return {
      async release() {
        released = true;
        clearTimeout(timer);
        await letGo();
      },
    };
  };
