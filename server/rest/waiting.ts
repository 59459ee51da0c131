/**
 * Long polls. The order is the point: (1) the waiter is registered, (2) the state is read, (3) the waiter sleeps until
 * an event of its topic, its timer, the end of its token, the client's leaving, or shutdown, (4) the state is read
 * again. An event between (1) and (2) is remembered, so that none is lost; checking first and listening after would
 * lose the one in between.
 *
 * While the process hears nothing from the database (`LOST`), waiters look for themselves once a second: a read that
 * fails ends the wait with that failure, one that works keeps it going. After `RECONNECTED` everybody reads again.
 */
import type { Notifications, StoreEvent } from '../store/store.ts';

/** How often a waiter reads by itself while no notifications come, ms. */
const DEAF_INTERVAL_MS = 1000;

export const computationTopic = (computationId: string): string => `computation ${computationId}`;
export const releaseTopic = (chipSerial: string, name: string): string => `release ${chipSerial} ${name}`;

export type WaitEnd = 'SETTLED' | 'TIMED_OUT' | 'TOKEN_ENDED' | 'DRAINED' | 'CLIENT_LEFT';

export interface WaitAsk<T> {
  readonly topic: string;
  readonly tokenId: string;
  /** When the token runs out by itself; null: never. */
  readonly tokenExpiresAt: Date | null;
  readonly seconds: number;
  readonly read: () => Promise<T>;
  readonly isSettled: (value: T) => boolean;
  /** Aborted when the client has gone. */
  readonly signal: AbortSignal;
}

export interface Waited<T> {
  readonly end: WaitEnd;
  /** The state as it was read last, always after the waiter was registered. */
  readonly value: T;
}

export interface Waiting {
  /** Null: this token has as many long polls open as it may. Rejects with what `read` throws. */
  wait<T>(ask: WaitAsk<T>): Promise<Waited<T>> | null;
  /** Ends every wait now, and every later one after its first read. */
  drain(): void;
  readonly open: number;
}

interface Waiter {
  readonly topic: string;
  readonly tokenId: string;
  /** Something may have changed: read again. */
  nudge(): void;
  end(reason: WaitEnd): void;
}

export function createWaiting(notifications: Notifications, limits: { readonly longPolls: number }): Waiting {
  const waiters = new Set<Waiter>();
  let drained = false;

  const wake = (matches: (waiter: Waiter) => boolean): void => {
    for (const waiter of waiters) if (matches(waiter)) waiter.nudge();
  };
  const hear = (event: StoreEvent): void => {
    switch (event.kind) {
      case 'COMPUTATION':
        wake((waiter) => waiter.topic === computationTopic(event.id));
        break;
      case 'RELEASE':
        wake((waiter) => waiter.topic === releaseTopic(event.chipSerial, event.name));
        break;
      case 'TOKEN':
        for (const waiter of waiters) if (waiter.tokenId === event.id) waiter.end('TOKEN_ENDED');
        break;
      case 'LOST':
      case 'RECONNECTED':
        wake(() => true);
        break;
      case 'CANCEL':
        break;
    }
  };
  const unsubscribe = notifications.subscribe(hear);

  const openOf = (tokenId: string): number => {
    let count = 0;
    for (const waiter of waiters) if (waiter.tokenId === tokenId) count += 1;
    return count;
  };

  async function sleepAndRead<T>(ask: WaitAsk<T>): Promise<Waited<T>> {
    const sleep = createSleep();
    const waiter: Waiter = { topic: ask.topic, tokenId: ask.tokenId, nudge: sleep.nudge, end: sleep.end };
    waiters.add(waiter);
    const untilExpiryMs =
      ask.tokenExpiresAt === null ? Number.POSITIVE_INFINITY : ask.tokenExpiresAt.getTime() - Date.now();
    const timeoutMs = ask.seconds * 1000;
    const timer = setTimeout(
      () => sleep.end(untilExpiryMs < timeoutMs ? 'TOKEN_ENDED' : 'TIMED_OUT'),
      Math.max(0, Math.min(timeoutMs, untilExpiryMs)),
    );
    const deaf = setInterval(() => {
      if (!notifications.connected) sleep.nudge();
    }, DEAF_INTERVAL_MS);
    const leave = (): void => sleep.end('CLIENT_LEFT');
    ask.signal.addEventListener('abort', leave, { once: true });
    if (drained) sleep.end('DRAINED');
    try {
      let value = await ask.read();
      while (!ask.isSettled(value)) {
        const end = await sleep.next();
        value = await ask.read();
        if (end !== null)
          return { end: ask.isSettled(value) && end !== 'TOKEN_ENDED' ? 'SETTLED' : end, value };
      }
      return { end: 'SETTLED', value };
    } finally {
      clearTimeout(timer);
      clearInterval(deaf);
      ask.signal.removeEventListener('abort', leave);
      waiters.delete(waiter);
    }
  }

  return {
    wait(ask) {
      return openOf(ask.tokenId) >= limits.longPolls ? null : sleepAndRead(ask);
    },
    drain() {
      drained = true;
      unsubscribe();
      for (const waiter of waiters) waiter.end('DRAINED');
    },
    get open() {
      return waiters.size;
    },
  };
}

interface Sleep {
  nudge(): void;
  end(reason: WaitEnd): void;
  /** Null: nudged. A nudge or an end that came while nobody slept is answered at once; the first end stays. */
  next(): Promise<WaitEnd | null>;
}

function createSleep(): Sleep {
  let nudged = false;
  let ended: WaitEnd | null = null;
  let wakeUp: (() => void) | null = null;
  return {
    nudge() {
      nudged = true;
      wakeUp?.();
    },
    end(reason) {
      ended ??= reason;
      wakeUp?.();
    },
    async next() {
      if (!nudged && ended === null) {
        await new Promise<void>((resolve) => {
          wakeUp = resolve;
        });
        wakeUp = null;
      }
      nudged = false;
      return ended;
    },
  };
}
