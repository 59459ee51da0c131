/**
 * One key of one actor names one write. The insert is the lock: a second request with the same key waits for the first
 * to commit, then reads what it made. A write that was refused or failed rolls its key back with everything else.
 */
import { one, type Transaction } from './database.ts';
import type { Acting, Idempotency } from './records.ts';

export type Claim =
  | { readonly kind: 'NEW' }
  | { readonly kind: 'REUSED' }
  | { readonly kind: 'REPLAY'; readonly subjectId: string };

export async function claimKey(
  tx: Transaction,
  by: Acting,
  idempotency: Idempotency | undefined,
): Promise<Claim> {
  if (!idempotency) return { kind: 'NEW' };
  const { key, operation, fingerprint } = idempotency;
  const claimed = await tx.query(
    `insert into idempotency (actor_id, key, operation, fingerprint, subject_id) values ($1, $2, $3, $4, '')
     on conflict do nothing`,
    [by.actorId, key, operation, fingerprint],
  );
  if (claimed.rowCount === 1) return { kind: 'NEW' };
  const before = await one<{ same: boolean; subjectId: string }>(
    tx,
    `select operation = $3 and fingerprint = $4 as same, subject_id as "subjectId"
     from idempotency where actor_id = $1 and key = $2`,
    [by.actorId, key, operation, fingerprint],
  );
  // Null: forgotten by age in between. Its holder would have to be days old: treat as another body.
  if (!before?.same) return { kind: 'REUSED' };
  return { kind: 'REPLAY', subjectId: before.subjectId };
}

/** Names what the key's write made, in the same transaction. */
export async function settleKey(
  tx: Transaction,
  by: Acting,
  idempotency: Idempotency | undefined,
  subjectId: string,
): Promise<void> {
  if (!idempotency) return;
  await tx.query('update idempotency set subject_id = $3 where actor_id = $1 and key = $2', [
    by.actorId,
    idempotency.key,
    subjectId,
  ]);
}
