/** One LISTEN connection a process; when it is lost it comes back by itself, and everybody is told to read again. */
import pg from 'pg';
import { connectionOf } from './connection.ts';
import type { Database } from './database.ts';
import { CHANNELS, type Channel } from './notify.ts';
import type { Notifications, StoreEvent } from './store.ts';

const FIRST_DELAY_MS = 100;
const LONGEST_DELAY_MS = 5000;
/** A silent network drop is noticed by asking. */
const PING_INTERVAL_MS = 5000;
const PING_TIMEOUT_MS = 4000;

function eventOf(channel: Channel, payload: string): StoreEvent | null {
  if (channel === 'computation') return { kind: 'COMPUTATION', id: payload };
  if (channel === 'cancel') return { kind: 'CANCEL', id: payload };
  if (channel === 'token') return { kind: 'TOKEN', id: payload };
  const [chipSerial, name, sequence] = payload.split(' ');
  if (chipSerial === undefined || name === undefined || sequence === undefined) return null;
  return { kind: 'RELEASE', chipSerial, name, sequence: Number(sequence) };
}

export interface Listening extends Notifications {
  close(): Promise<void>;
}

/** Resolves once it listens. @throws what the first connection throws. */
export async function listen(database: Database): Promise<Listening> {
  const listeners = new Set<(event: StoreEvent) => void>();
  let client: pg.Client | null = null;
  let connected = false;
  let closed = false;
  let timer: NodeJS.Timeout | undefined;

  const tell = (event: StoreEvent): void => {
    for (const listener of listeners) {
      try {
        listener(event);
      } catch (error) {
        database.logger.warn({ err: error }, 'a listener to notifications failed');
      }
    }
  };

  const connect = async (): Promise<void> => {
    const fresh = new pg.Client({ ...connectionOf(database.url), query_timeout: PING_TIMEOUT_MS });
    client = fresh;
    let up = false;
    const lost = (): void => {
      if (client !== fresh) return;
      client = null;
      connected = false;
      fresh.end().catch(() => {});
      if (!up || closed) return;
      database.logger.warn({}, 'notifications lost, reconnecting');
      tell({ kind: 'LOST' });
      retry(FIRST_DELAY_MS);
    };
    fresh.on('error', lost).on('end', lost);
    fresh.on('notification', ({ channel, payload }) => {
      const event = eventOf(channel as Channel, payload ?? '');
      if (event) tell(event);
    });
    try {
      await fresh.connect();
      await fresh.query(CHANNELS.map((channel) => `listen ${channel}`).join('; '));
    } catch (error) {
      lost();
      throw error;
    }
    up = true;
    connected = true;
    watch(fresh, lost);
  };

  const watch = (watched: pg.Client, lost: () => void): void => {
    timer = setTimeout(() => {
      watched.query('select 1').then(() => {
        if (client === watched && !closed) watch(watched, lost);
      }, lost);
    }, PING_INTERVAL_MS).unref();
  };

  const retry = (delayMs: number): void => {
    clearTimeout(timer);
    timer = setTimeout(() => {
      connect().then(
        () => {
          if (!closed) tell({ kind: 'RECONNECTED' });
        },
        () => {
          if (!closed) retry(Math.min(delayMs * 2, LONGEST_DELAY_MS));
        },
      );
    }, delayMs);
  };

  await connect();
  return {
    subscribe(listener) {
      listeners.add(listener);
      return () => listeners.delete(listener);
    },
    get connected() {
      return connected;
    },
    async close() {
      closed = true;
      clearTimeout(timer);
      const last = client;
      client = null;
      await last?.end().catch(() => {});
    },
  };
}
