/** A result that took minutes is not thrown away because the database is gone for seconds. */
import { setTimeout as sleep } from 'node:timers/promises';
import type { Logger } from 'pino';
import { StoreUnavailable } from '../store/index.ts';

/** Longer than a restart or a failover takes; after it the queue computes again. */
const PATIENCE_MS = 60_000;
const PAUSE_MS = 500;

/**
 * Repeats `write` while the store is away. A write whose commit got lost is safe to repeat: the fence lets one through.
 * @throws the last StoreUnavailable when patience or `shutdown` ends it, and any other error at once.
 */
export async function persist<T>(write: () => Promise<T>, shutdown: AbortSignal, logger: Logger): Promise<T> {
  const until = performance.now() + PATIENCE_MS;
  for (;;) {
    try {
      return await write();
    } catch (error) {
      if (!(error instanceof StoreUnavailable) || shutdown.aborted || performance.now() > until) throw error;
      logger.warn({ err: error }, 'result not stored yet: the database is away');
      await sleep(PAUSE_MS);
    }
  }
}
