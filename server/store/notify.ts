/** Notices between processes: ids only (the payload is limited to 8 kB), delivered when the transaction commits. */
import type { Transaction } from './database.ts';

export const CHANNELS = ['computation', 'cancel', 'release', 'token'] as const;

export type Channel = (typeof CHANNELS)[number];

export async function notify(tx: Transaction, channel: Channel, payload: string): Promise<void> {
  await tx.query({ name: 'notify', text: 'select pg_notify($1, $2)', values: [channel, payload] });
}
