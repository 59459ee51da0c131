import { validate as isUuid } from 'uuid';
import { type Database, inTransaction } from '../database.ts';
import { writeHistory } from '../history/write.ts';
import { notify } from '../notify.ts';
import type { Who } from '../store.ts';
import { readToken } from './find.ts';

/**
 * All live admin tokens are locked, in id order, before one of them goes: two admins who revoke each other wait, and
 * the second sees one left.
 */
const LOCK_ADMINS = `select id from token where role = 'ADMIN' and revoked_at is null
  and (expires_at is null or expires_at > now()) order by id for update`;

export const revokeToken =
  (database: Database): Who['revokeToken'] =>
  (by, id) =>
    inTransaction(database, async (tx, undo) => {
      const before = isUuid(id) ? await readToken(tx, id) : null;
      if (!before) return undo({ outcome: 'NOT_FOUND' });
      if (before.role === 'ADMIN') {
        const admins = await tx.query<{ id: string }>(LOCK_ADMINS);
        const others = admins.rows.filter((admin) => admin.id !== id);
        const live = admins.rows.length > others.length;
        if (live && others.length === 0) return undo({ outcome: 'LAST_ADMIN' });
      }
      const revoked = await tx.query(
        'update token set revoked_at = now(), revoked_by = $2 where id = $1 and revoked_at is null',
        [id, by.actorId],
      );
      if (revoked.rowCount === 1) {
        await writeHistory(tx, by, {
          action: 'token.revoked',
          subjectKind: 'Token',
          subjectId: id,
          chipId: null,
          detail: { actor: before.actor.name, role: before.role, label: before.label },
        });
        await notify(tx, 'token', id);
      }
      const record = (await readToken(tx, id)) ?? before;
      return { outcome: 'WRITTEN', record, replayed: revoked.rowCount === 0 };
    });
