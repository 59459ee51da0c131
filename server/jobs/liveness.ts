/**
 * How processes know of each other's death. Each worker process holds a session lock and a row with the names under
 * which it locks jobs; each looks every second for rows whose lock nobody holds and frees their jobs. A process that
 * lost its session (the database restarted) may have been taken for dead, and registers again.
 */
import { utimes, writeFile } from 'node:fs/promises';
import { setTimeout as sleep } from 'node:timers/promises';
import type { Logger } from 'pino';
import { ENGINE_VERSION } from '../../src/conventions.ts';
import type { Computations, Notifications } from '../store/index.ts';

const SWEEP_INTERVAL_MS = 1000;

export interface LivenessDeps {
  readonly store: Pick<Computations, 'registerWorker' | 'sweep'> & { readonly notifications: Notifications };
  readonly logger: Logger;
  /** Touched after every successful look, for health checks from outside. */
  readonly heartbeatFile?: string;
}

export interface Liveness {
  /** Replaces the names under which this process holds jobs. */
  register(poolIds: readonly string[]): Promise<void>;
  /** The row goes, so that nobody waits for this process. */
  stop(): Promise<void>;
}

async function touch(file: string): Promise<void> {
  const now = new Date();
  await utimes(file, now, now).catch(() => writeFile(file, ''));
}

export function startLiveness({ store, logger, heartbeatFile }: LivenessDeps): Liveness {
  const stopping = new AbortController();
  let names: readonly string[] = [];
  let registration: { release(): Promise<void> } | null = null;
  /** Registrations one after the other. */
  let turn: Promise<void> = Promise.resolve();
  /** Set when the session behind the registration may be gone; tried every second until it works. */
  let stale = false;

  const registerAgain = (): Promise<void> => {
    turn = turn
      .catch(() => {})
      .then(async () => {
        stale = true;
        await registration?.release().catch(() => {});
        registration = null;
        if (names.length === 0 || stopping.signal.aborted) return;
        registration = await store.registerWorker(names, ENGINE_VERSION);
        stale = false;
      });
    return turn;
  };

  const look = async (): Promise<void> => {
    if (stale) await registerAgain();
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
  const unsubscribe = store.notifications.subscribe((event) => {
    if (event.kind === 'RECONNECTED') registerAgain().catch(() => {});
  });

  return {
    register(poolIds) {
      names = poolIds;
      return registerAgain();
    },
    async stop() {
      stopping.abort();
      unsubscribe();
      await looping;
      await turn.catch(() => {});
      await registration?.release().catch(() => {});
    },
  };
}
