import { v7 as newId } from 'uuid';
import { type Database, inTransaction, one, type Transaction } from '../database.ts';
import { writeHistory } from '../history/write.ts';
import { claimKey, settleKey } from '../idempotency.ts';
import type { Acting } from '../records.ts';
import type { Configurations } from '../store.ts';
import { readVersion } from './version.ts';

/** The head as it stands while this transaction lasts: a revision in progress is waited for, a later one waits. */
export async function holdHead(tx: Transaction, chipId: string): Promise<{ id: string; number: number }> {
  // Two statements: a lock that had to wait returns the new head, and the look-up after it needs a snapshot that has it.
  const chip = await one<{ number: number }>(
    tx,
    'select head_revision as number from chip where id = $1 for share',
    [chipId],
  );
  if (!chip) throw new Error(`no chip ${chipId}`);
  const revision = await one<{ id: string }>(
    tx,
    'select id from chip_revision where chip_id = $1 and number = $2',
    [chipId, chip.number],
  );
  if (!revision) throw new Error(`chip ${chipId} has no head revision`);
  return { id: revision.id, number: chip.number };
}

/** Numbers come from the configuration's counter, whose row is the lock; null when it is not where the caller saw it. */
async function nextNumber(
  tx: Transaction,
  by: Acting,
  ask: { chipId: string; configuration: string; expectedVersion?: number },
): Promise<{ configurationId: string; number: number } | { lastVersion: number }> {
  await tx.query(
    'insert into configuration (id, chip_id, name, created_by) values ($1, $2, $3, $4) on conflict do nothing',
    [newId(), ask.chipId, ask.configuration, by.actorId],
  );
  const counted = await one<{ configurationId: string; number: number }>(
    tx,
    `update configuration set last_version = last_version + 1
     where chip_id = $1 and name = $2 and ($3::int is null or last_version = $3)
     returning id as "configurationId", last_version as number`,
    [ask.chipId, ask.configuration, ask.expectedVersion ?? null],
  );
  if (counted) return counted;
  const last = await one<{ lastVersion: number }>(
    tx,
    'select last_version as "lastVersion" from configuration where chip_id = $1 and name = $2',
    [ask.chipId, ask.configuration],
  );
  return last ?? { lastVersion: 0 };
}

export const saveVersion =
  (database: Database): Configurations['saveVersion'] =>
  (by, ask, idempotency) =>
    inTransaction(database, async (tx, undo) => {
      const claim = await claimKey(tx, by, idempotency);
      if (claim.kind === 'REUSED') return undo({ outcome: 'KEY_REUSED' });
      const id = claim.kind === 'REPLAY' ? claim.subjectId : newId();
      if (claim.kind === 'NEW') {
        const head = await holdHead(tx, ask.chipId);
        if (head.id !== ask.designRevisionId) {
          return undo({ outcome: 'STALE_CHIP_REVISION', headRevision: head.number });
        }
        const next = await nextNumber(tx, by, ask);
        if ('lastVersion' in next) return undo({ outcome: 'VERSION_MOVED', lastVersion: next.lastVersion });
        await tx.query(
          `insert into configuration_version (id, configuration_id, chip_id, number, chip_revision_id, source_kind,
             design_id, setting, content_hash, note, created_by)
           values ($1, $2, $3, $4, $5, 'DESIGN', $6, $7, $8, $9, $10)`,
          [
            id,
            next.configurationId,
            ask.chipId,
            next.number,
            head.id,
            ask.designId,
            JSON.stringify(ask.setting),
            ask.contentHash,
            ask.note,
            by.actorId,
          ],
        );
        await writeHistory(tx, by, {
          action: 'version.saved',
          subjectKind: 'ConfigurationVersion',
          subjectId: id,
          chipId: ask.chipId,
          detail: { configuration: ask.configuration, number: next.number },
        });
        await settleKey(tx, by, idempotency, id);
      }
      const record = await readVersion(tx, id);
      if (!record) throw new Error('a version just written is not there');
      return { outcome: 'WRITTEN', record, replayed: claim.kind === 'REPLAY' };
    });
