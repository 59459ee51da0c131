import type pg from 'pg';

/** Long enough for a loaded machine, short enough for a request that waits. */
const CONNECT_TIMEOUT_MS = 2000;

/** How every connection of this process is opened. */
export function connectionOf(url: string): pg.ClientConfig {
  return {
    connectionString: url,
    connectionTimeoutMillis: CONNECT_TIMEOUT_MS,
    keepAlive: true,
    application_name: 'ringbinder',
  };
}
