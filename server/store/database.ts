/** The pool, the Prisma client upon it, and transactions. */
import { PrismaPg } from '@prisma/adapter-pg';
import pg from 'pg';
import { connectionOf } from './connection.ts';
import { PrismaClient } from './generated/client.ts';

/** No statement of this store takes a tenth of it. */
const STATEMENT_TIMEOUT_MS = 10_000;
/** The server cannot say that it timed out when the network is gone: then we stop waiting. */
const ANSWER_TIMEOUT_MS = 12_000;
/** Lock orders exclude deadlocks between our own statements; foreign keys of others (a restore, a hand at psql) may still make one. */
const TRIES = 3;
const RETRIED = new Set(['40001', '40P01']);

export interface StoreLogger {
  info(fields: object, text: string): void;
  warn(fields: object, text: string): void;
}

export interface Database {
  readonly url: string;
  readonly pool: pg.Pool;
  /**
   * For the queue and for what workers write. Its commits do not wait for the disk: all of it can be computed again, and
   * the server's log keeps its order, so that whatever a person writes afterwards takes it along. A design has about five
   * such commits; waiting cost 0.2 ms each on a virtual disk, and costs a turn of the platter on a spinning one.
   */
  readonly workPool: pg.Pool;
  readonly prisma: PrismaClient;
  readonly logger: StoreLogger;
}

export type Transaction = pg.PoolClient;

function openPool(url: string, poolSize: number, logger: StoreLogger, options?: string): pg.Pool {
  const pool = new pg.Pool({
    ...connectionOf(url),
    ...(options === undefined ? {} : { options }),
    max: poolSize,
    statement_timeout: STATEMENT_TIMEOUT_MS,
    query_timeout: ANSWER_TIMEOUT_MS,
    idle_in_transaction_session_timeout: STATEMENT_TIMEOUT_MS,
  });
  // An 'error' without a listener ends the process: idle connections report their loss here, busy ones to their query as well.
  pool.on('error', (error) => logger.warn({ err: error }, 'an idle database connection was lost'));
  pool.on('connect', (client) => client.on('error', () => {}));
  return pool;
}

/** Connections are opened as they are needed: a process without a worker has none in its work pool. */
export function openDatabase(url: string, poolSize: number, logger: StoreLogger): Database {
  const pool = openPool(url, poolSize, logger);
  const workPool = openPool(url, poolSize, logger, '-c synchronous_commit=off');
  return { url, pool, workPool, prisma: new PrismaClient({ adapter: new PrismaPg(pool) }), logger };
}

/** Thrown inside a transaction to undo it and still answer something. */
class Undone {
  constructor(readonly answer: unknown) {}
}

async function attempt<T>(
  pool: pg.Pool,
  work: (tx: Transaction, undo: (answer: T) => never) => Promise<T>,
): Promise<T> {
  const tx = await pool.connect();
  let broken: Error | undefined;
  try {
    await tx.query('begin');
    const answer = await work(tx, (value) => {
      throw new Undone(value);
    });
    await tx.query('commit');
    return answer;
  } catch (error) {
    await tx.query('rollback').catch((failure: Error) => {
      broken = failure;
    });
    if (error instanceof Undone) return error.answer as T;
    throw error;
  } finally {
    tx.release(broken);
  }
}

/**
 * READ COMMITTED. `undo(answer)` rolls back and answers. Locks are taken in the order idempotency key, chip,
 * computation, request, configuration, release head; history and NOTIFY come last.
 */
export async function inTransaction<T>(
  database: Database,
  work: (tx: Transaction, undo: (answer: T) => never) => Promise<T>,
): Promise<T> {
  for (let tries = 1; ; tries++) {
    try {
      return await attempt(database.pool, work);
    } catch (error) {
      const code: unknown = error instanceof Error ? Reflect.get(error, 'code') : undefined;
      if (tries >= TRIES || typeof code !== 'string' || !RETRIED.has(code)) throw error;
    }
  }
}

/** The first row, or null. */
export async function one<T extends pg.QueryResultRow>(
  on: pg.Pool | Transaction,
  query: pg.QueryConfig | string,
  values?: unknown[],
): Promise<T | null> {
  const { rows } = await on.query<T>(query, values);
  return rows[0] ?? null;
}
