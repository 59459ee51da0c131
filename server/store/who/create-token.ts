import { v7 as newId } from 'uuid';
import { type Database, inTransaction, one, type Transaction } from '../database.ts';
import { writeHistory } from '../history/write.ts';
import type { ActorKind, ActorRecord } from '../records.ts';
import type { Who } from '../store.ts';
import { readToken } from './find.ts';

/** Makes the actor unless the name is known. Null: known, of another kind. */
export async function ensureActor(tx: Transaction, name: string, kind: ActorKind): Promise<string | null> {
  await tx.query('insert into actor (id, kind, name) values ($1, $2, $3) on conflict do nothing', [
    newId(),
    kind,
    name,
  ]);
  const actor = await one<Pick<ActorRecord, 'id' | 'kind'>>(
    tx,
    'select id, kind from actor where name = $1',
    [name],
  );
  return actor?.kind === kind ? actor.id : null;
}

export const createToken =
  (database: Database): Who['createToken'] =>
  (by, ask) =>
    inTransaction(database, async (tx, undo) => {
      const actorId = await ensureActor(tx, ask.actor, ask.actorKind);
      if (actorId === null) return undo({ outcome: 'NAME_TAKEN' });
      const id = newId();
      await tx.query(
        `insert into token (id, actor_id, lookup, secret_hash, role, label, created_by, expires_at)
         values ($1, $2, $3, $4, $5, $6, $7, $8)`,
        [id, actorId, ask.lookup, ask.secretHash, ask.role, ask.label, by.actorId, ask.expiresAt],
      );
      await writeHistory(tx, by, {
        action: 'token.created',
        subjectKind: 'Token',
        subjectId: id,
        chipId: null,
        detail: { actor: ask.actor, role: ask.role, label: ask.label },
      });
      const record = await readToken(tx, id);
      if (!record) throw new Error('a token just written is not there');
      return { outcome: 'WRITTEN', record, replayed: false };
    });
