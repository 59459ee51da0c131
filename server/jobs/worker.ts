/**
 * A worker: takes computations from the queue, computes them in threads, stores what comes out.
 *
 * The queue library fetches job by job (`localQueue` off): a local queue of 50 brings 12,000-15,000 jobs a second
 * against 1,000-1,500, but a design takes milliseconds to minutes, so fetching never is the limit, and jobs that one
 * process has locked ahead would wait for it while others are idle. From `add_job` to the start of the task: 3-5 ms.
 */
import { EventEmitter } from 'node:events';
import { setTimeout as sleep } from 'node:timers/promises';
import { type JobHelpers, makeWorkerUtils, run, type WorkerEvents } from 'graphile-worker';
import type { Logger } from 'pino';
import { z } from 'zod';
import { ENGINE_VERSION } from '../../src/conventions.ts';
import type { Store } from '../store/index.ts';
import { computing } from './computation.ts';
import { queueLogger } from './queue-logger.ts';
import { startSweeper } from './sweeper.ts';
import { startThreads } from './threads.ts';

/** Other engines' jobs are left alone, so old and new processes can run side by side. */
const TASK = `design/${ENGINE_VERSION}`;

/** New jobs are announced; freed ones (a dead worker's, a second try) are found at the next look. */
const POLL_INTERVAL_MS = 1000;

/** Between an end of the queue's runner that nobody asked for and the next one. */
const RESTART_PAUSE_MS = 1000;

const jobRule = z.object({ id: z.uuid() });

export interface WorkerOptions {
  readonly store: Store;
  readonly logger: Logger;
  readonly threads: number;
  readonly computationTimeoutS: number;
  /** Seconds that running computations get at `stop()`. */
  readonly drainS: number;
  readonly heartbeatFile?: string;
  /** Another file with the exports of `design-thread.ts`. */
  readonly threadFile?: URL;
}

export interface Worker {
  /** Computations that run in this process now. */
  readonly running: number;
  /** Takes no more jobs, lets running ones finish for `drainS`, gives the rest back at once. */
  stop(): Promise<void>;
}

interface Queue {
  /** Settles when the queue ended, whoever ended it. */
  readonly ended: Promise<void>;
  stop(): Promise<void>;
}

type Task = (payload: unknown, job: JobHelpers) => Promise<void>;

async function startQueue(options: WorkerOptions, task: Task): Promise<Queue> {
  const { store, logger } = options;
  const events = new EventEmitter() as WorkerEvents;
  const poolIds: string[] = [];
  events.on('pool:create', ({ workerPool }) => poolIds.push(workerPool.id));
  const runner = await run({
    // A pool of our own making: with a connection string a job aborted at shutdown would stay locked.
    pgPool: store.pool,
    noHandleSignals: true,
    taskList: { [TASK]: task },
    events,
    preset: {
      worker: {
        concurrentJobs: options.threads,
        pollInterval: POLL_INTERVAL_MS,
        gracefulShutdownAbortTimeout: options.drainS * 1000,
        logger: queueLogger(logger),
      },
    },
  });
  const ended = runner.promise.catch((error: unknown) => logger.warn({ err: error }, 'the queue ended'));
  try {
    const registration = await store.registerWorker(poolIds, ENGINE_VERSION);
    return {
      ended: ended.then(() => registration.release()),
      stop: () => runner.stop().catch(() => {}),
    };
  } catch (error) {
    await runner.stop();
    throw error;
  }
}

/** Keeps a queue running: the library ends its own when it could not write a job's end. */
async function superviseQueue(options: WorkerOptions, task: Task): Promise<() => Promise<void>> {
  let stopping = false;
  let queue = await startQueue(options, task);
  const supervise = async (): Promise<void> => {
    for (;;) {
      await queue.ended;
      if (stopping) return;
      await sleep(RESTART_PAUSE_MS);
      await startQueue(options, task).then(
        async (next) => {
          queue = next;
          if (stopping) await next.stop();
        },
        (error: unknown) => options.logger.warn({ err: error }, 'the queue does not start yet'),
      );
    }
  };
  const supervising = supervise();
  return async () => {
    stopping = true;
    await queue.stop();
    await supervising;
  };
}

/** Starts a worker on a migrated database; ready to compute when it returns. */
export async function startWorker(options: WorkerOptions): Promise<Worker> {
  const { store, logger } = options;
  const threads = await startThreads(options.threads, options.threadFile);
  const computations = computing({ store, threads, logger, timeoutS: options.computationTimeoutS });
  const unsubscribe = store.notifications.subscribe((event) => {
    if (event.kind === 'CANCEL') computations.cancel(event.id);
    else if (event.kind === 'RECONNECTED') computations.recheck();
  });
  /** Jobs that were aborted by the shutdown, with the attempts they may take. */
  const aborted = new Map<string, number>();
  const stopQueue = await superviseQueue(options, async (payload, { job, abortSignal }) => {
    const { id } = jobRule.parse(payload);
    const shutdown = abortSignal ?? new AbortController().signal;
    try {
      await computations.run(id, shutdown);
    } catch (error) {
      if (shutdown.aborted) aborted.set(String(job.id), job.max_attempts);
      throw error;
    }
  });
  const { heartbeatFile } = options;
  const stopSweeper = startSweeper({
    store,
    logger,
    ...(heartbeatFile === undefined ? {} : { heartbeatFile }),
  });
  return {
    get running() {
      return computations.count;
    },
    async stop() {
      await stopQueue();
      await giveBack(store, aborted, logger);
      unsubscribe();
      await stopSweeper();
      await threads.close();
    },
  };
}

/**
 * An aborted run counts as a failed attempt and waits seconds for its next: neither is the computation's fault. It gets
 * one attempt more (the library cannot set the count of attempts back to 0).
 */
async function giveBack(store: Store, jobs: ReadonlyMap<string, number>, logger: Logger): Promise<void> {
  if (jobs.size === 0) return;
  const queue = await makeWorkerUtils({ pgPool: store.pool, logger: queueLogger(logger) });
  try {
    for (const [id, attempts] of jobs)
      await queue.rescheduleJobs([id], { runAt: new Date(), maxAttempts: attempts + 1 });
    logger.info({ jobs: jobs.size }, 'gave running computations back to the queue');
  } catch (error) {
    logger.warn({ err: error }, 'running computations wait for their next attempt');
  } finally {
    await queue.release();
  }
}
