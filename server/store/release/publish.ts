import { holdHead } from '../configuration/save-version.ts';
import { type Database, inTransaction, one, type Transaction } from '../database.ts';
import { writeHistory } from '../history/write.ts';
import { claimKey, settleKey } from '../idempotency.ts';
import { notify } from '../notify.ts';
import type { ReleaseRecord } from '../records.ts';
import type { Releases } from '../store.ts';
import { readRelease } from './find.ts';

/** Taken knowingly, an older chip revision's version may be published: that is how one goes back. */
const STALE_ACCEPTED = 'STALE_CHIP_REVISION';

/** The head's row is the lock of two publishers. `expected` undefined: whatever is there. Null: it is not where it was expected. */
async function nextSequence(
  tx: Transaction,
  chipId: string,
  name: string,
  expected: number | undefined,
): Promise<number | null> {
  const head = await one<{ sequence: number }>(
    tx,
    `insert into release_head as h (chip_id, name, sequence) values ($1, $2, 1)
     on conflict (chip_id, name) do update set sequence = h.sequence + 1 where $3::int is null or h.sequence = $3
     returning sequence`,
    [chipId, name, expected ?? null],
  );
  if (!head || (expected !== undefined && head.sequence !== expected + 1)) return null;
  return head.sequence;
}

async function replayed(tx: Transaction, subjectId: string): Promise<ReleaseRecord> {
  const [chipId = '', name = '', sequence] = subjectId.split('/');
  const record = await readRelease(tx, chipId, name, Number(sequence));
  if (!record) throw new Error('the release that a key names is not there');
  return record;
}

export const publishRelease =
  (database: Database): Releases['publishRelease'] =>
  (by, ask, idempotency) =>
    inTransaction(database, async (tx, undo) => {
      const { chipId, name, versionId } = ask;
      const claim = await claimKey(tx, by, idempotency);
      if (claim.kind === 'REUSED') return undo({ outcome: 'KEY_REUSED' });
      if (claim.kind === 'REPLAY') {
        return { outcome: 'WRITTEN', record: await replayed(tx, claim.subjectId), replayed: true };
      }
      const head = await holdHead(tx, chipId);
      const version = await one<{ chipRevisionId: string }>(
        tx,
        'select chip_revision_id as "chipRevisionId" from configuration_version where id = $1 and chip_id = $2',
        [versionId, chipId],
      );
      if (!version) throw new Error(`no version ${versionId} of chip ${chipId}`);
      if (version.chipRevisionId !== head.id && !ask.accepted.includes(STALE_ACCEPTED)) {
        return undo({ outcome: 'STALE_CHIP_REVISION', headRevision: head.number });
      }
      const sequence = await nextSequence(tx, chipId, name, ask.expectedSequence);
      if (sequence === null) {
        const present = await one<{ sequence: number }>(
          tx,
          // Our own insert, about to be undone, must not be taken for somebody's release.
          `select sequence from release_head h where chip_id = $1 and name = $2
             and exists (select 1 from release e where e.chip_id = h.chip_id and e.name = h.name)`,
          [chipId, name],
        );
        return undo({ outcome: 'SEQUENCE_MOVED', sequence: present?.sequence ?? 0 });
      }
      await tx.query(
        `insert into release (chip_id, name, sequence, version_id, note, accepted, created_by)
         values ($1, $2, $3, $4, $5, $6, $7)`,
        [chipId, name, sequence, versionId, ask.note, JSON.stringify(ask.accepted), by.actorId],
      );
      const record = await readRelease(tx, chipId, name, sequence);
      if (!record) throw new Error('a release just written is not there');
      const subjectId = `${chipId}/${name}/${sequence}`;
      await writeHistory(tx, by, {
        action: 'release.published',
        subjectKind: 'Release',
        subjectId,
        chipId,
        detail: { name, sequence, accepted: ask.accepted },
      });
      await settleKey(tx, by, idempotency, subjectId);
      await notify(tx, 'release', `${record.chipSerial} ${name} ${sequence}`);
      return { outcome: 'WRITTEN', record, replayed: false };
    });
