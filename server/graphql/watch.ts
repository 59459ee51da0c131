/**
 * The source of a subscription. The order is the point: it listens first and reads then, so that no change falls in
 * between; every event is only a hint to read again. It is an object and no generator: a generator that waits for a
 * promise is not told when its client vanishes, `return()` of an object is.
 */
import { problemOfUnknown } from '../errors.ts';
import type { Notifications, StoreEvent } from '../store/store.ts';

export interface Watch<T> {
  /** Whether there may be something new to read. */
  concerns(event: StoreEvent): boolean;
  /** What is new since it was called last, and whether nothing more can come. */
  read(): Promise<{ readonly news: readonly T[]; readonly isFinal: boolean }>;
}

/** How long to wait before a read that failed because the database is away is tried again, ms. */
const RETRY_MS = 1000;

const END: IteratorReturnResult<undefined> = { done: true, value: undefined };

/** Ends by itself when a read was final, with the client, or with whoever calls `return()`. */
export function watch<T>(
  notifications: Notifications,
  { concerns, read }: Watch<T>,
): AsyncIterableIterator<T> {
  const unread: T[] = [];
  let isStale = true;
  let isOver = false;
  let wakeUp: (() => void) | null = null;

  const wake = (): void => {
    wakeUp?.();
    wakeUp = null;
  };
  const unsubscribe = notifications.subscribe((event) => {
    // After an outage anything may have happened.
    if (event.kind !== 'RECONNECTED' && !concerns(event)) return;
    isStale = true;
    wake();
  });
  const end = (): void => {
    isOver = true;
    unsubscribe();
    wake();
  };
  const sleep = (timeoutMs?: number): Promise<void> =>
    new Promise((resolve) => {
      const timer = timeoutMs === undefined ? undefined : setTimeout(resolve, timeoutMs);
      wakeUp = () => {
        clearTimeout(timer);
        resolve();
      };
    });

  async function readAgain(): Promise<void> {
    isStale = false;
    try {
      const { news, isFinal } = await read();
      unread.push(...news);
      if (isFinal) end();
    } catch (error) {
      if (problemOfUnknown(error).problem.code !== 'SERVICE_UNAVAILABLE') {
        end();
        throw error;
      }
      isStale = true;
      await sleep(RETRY_MS);
    }
  }

  return {
    async next() {
      for (;;) {
        const value = unread.shift();
        if (value !== undefined) return { done: false, value };
        if (isOver) return END;
        if (isStale) await readAgain();
        else await sleep();
      }
    },
    async return() {
      unread.length = 0;
      end();
      return END;
    },
    async throw(error) {
      end();
      throw error;
    },
    [Symbol.asyncIterator]() {
      return this;
    },
  };
}
