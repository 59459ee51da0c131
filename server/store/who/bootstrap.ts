import { v7 as newId } from 'uuid';
import { type Database, inTransaction } from '../database.ts';
import { writeHistory } from '../history/write.ts';
import type { Who } from '../store.ts';
import { ensureActor } from './create-token.ts';

/** Who acts when no person does: computations that end, the first token. */
const SYSTEM_NAME = 'ringbinder';
const FIRST_ADMIN = 'first_admin';
/** Beside the first admin token; a person's own token is the next step. */
const ADMIN_NAME = 'admin';

export async function ensureSystemActor(database: Database): Promise<string> {
  const id = await inTransaction(database, (tx) => ensureActor(tx, SYSTEM_NAME, 'SYSTEM'));
  if (id === null) throw new Error(`the actor "${SYSTEM_NAME}" exists and is not the system`);
  return id;
}

/** Of several first starts the bootstrap row lets one through; the others wait for it and then see it. */
export const bootstrapAdmin =
  (database: Database): Who['bootstrapAdmin'] =>
  (ask) =>
    inTransaction<boolean>(database, async (tx) => {
      const won = await tx.query(
        "insert into bootstrap (key, value) values ($1, '{}') on conflict do nothing",
        [FIRST_ADMIN],
      );
      if (won.rowCount === 0) return false;
      const system = await ensureActor(tx, SYSTEM_NAME, 'SYSTEM');
      const admin = await ensureActor(tx, ADMIN_NAME, 'PERSON');
      if (system === null || admin === null) throw new Error('a name of the service itself is taken');
      const id = newId();
      await tx.query(
        `insert into token (id, actor_id, lookup, secret_hash, role, label, created_by)
         values ($1, $2, $3, $4, 'ADMIN', 'first admin token', $5)`,
        [id, admin, ask.lookup, ask.secretHash, system],
      );
      await writeHistory(
        tx,
        { actorId: system, tokenId: null },
        {
          action: 'token.created',
          subjectKind: 'Token',
          subjectId: id,
          chipId: null,
          detail: { actor: ADMIN_NAME, role: 'ADMIN', label: 'first admin token' },
        },
      );
      return true;
    });
