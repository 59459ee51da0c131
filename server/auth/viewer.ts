/** Whoever a request comes from, once the token has been believed. */
import type { Acting, ActorRecord, Role } from '../store/records.ts';

export interface Viewer {
  readonly actor: ActorRecord;
  readonly role: Role;
  readonly tokenId: string;
  readonly expiresAt: Date | null;
}

export function actingOf(viewer: Viewer): Acting {
  return { actorId: viewer.actor.id, tokenId: viewer.tokenId };
}
