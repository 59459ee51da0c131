/** Every worker process looks each second after what dead ones left, and shows from outside that it is well. */
import { utimes, writeFile } from 'node:fs/promises';
import { setTimeout as sleep } from 'node:timers/promises';
import type { Logger } from 'pino';
import type { Computations } from '../store/index.ts';

const SWEEP_INTERVAL_MS = 1000;

export interface SweeperOptions {
  readonly store: Pick<Computations, 'sweep'>;
  readonly logger: Logger;
  /** Touched after every successful look, for health checks from outside. */
  readonly heartbeatFile?: string;
}

async function touch(file: string): Promise<void> {
  const now = new Date();
  await utimes(file, now, now).catch(() => writeFile(file, ''));
}

/** @returns what ends it, after the look under way. */
export function startSweeper({ store, logger, heartbeatFile }: SweeperOptions): () => Promise<void> {
  const stopping = new AbortController();
  const look = async (): Promise<void> => {
    const { freed, failed } = await store.sweep();
    if (freed > 0 || failed > 0) logger.warn({ freed, failed }, 'took care of what dead workers left');
    if (heartbeatFile !== undefined) await touch(heartbeatFile);
  };
  const loop = async (): Promise<void> => {
    while (!stopping.signal.aborted) {
      await look().catch((error: unknown) =>
        logger.warn({ err: error }, 'could not look after other workers'),
      );
      await sleep(SWEEP_INTERVAL_MS, undefined, { signal: stopping.signal }).catch(() => {});
    }
  };
  const looping = loop();
  return async () => {
    stopping.abort();
    await looping;
  };
}
