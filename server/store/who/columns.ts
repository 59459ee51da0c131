import type { ActorKind, TokenRecord } from '../records.ts';

/** A token with its actor; the alias of the token is `t`. */
export const TOKEN_FROM = `select t.id, t.lookup, t.secret_hash as "secretHash", t.role, t.label,
    t.created_at as "createdAt", t.created_by as "createdBy", t.expires_at as "expiresAt", t.revoked_at as "revokedAt",
    u.last_used_at as "lastUsedAt", a.id as "actorId", a.kind as "actorKind", a.name as "actorName",
    a.created_at as "actorCreatedAt"
  from token t join actor a on a.id = t.actor_id left join token_use u on u.token_id = t.id`;

export type TokenRow = Omit<TokenRecord, 'actor'> & {
  actorId: string;
  actorKind: ActorKind;
  actorName: string;
  actorCreatedAt: Date;
};

export function tokenOf({ actorId, actorKind, actorName, actorCreatedAt, ...rest }: TokenRow): TokenRecord {
  return { ...rest, actor: { id: actorId, kind: actorKind, name: actorName, createdAt: actorCreatedAt } };
}
