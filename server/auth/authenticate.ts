/**
 * From the Authorization header to a viewer. Tokens are remembered so that a request costs no look-up, under two
 * conditions: the database tells this process of every revocation (LISTEN is up), and nothing was told while the
 * row was being read.
 */
import { type TokenFault, unauthenticated } from '../errors.ts';
import type { TokenRecord } from '../store/records.ts';
import type { Store } from '../store/store.ts';
import { isSameHash, tokenPartsOf } from './token.ts';
import type { Viewer } from './viewer.ts';

export interface Authenticator {
  /** @throws ProblemError UNAUTHENTICATED; SERVICE_UNAVAILABLE comes from the store */
  authenticate(authorization: string | undefined): Promise<Viewer>;
  close(): void;
}

export interface AuthenticatorDeps {
  readonly store: Pick<Store, 'findToken' | 'noteTokenUse' | 'notifications'>;
  /** Milliseconds since 1970. */
  readonly clock?: () => number;
}

/** Remembered at most; more tokens than a lab has. */
const CACHE_ENTRIES = 10_000;
/** How often the use of a token is written down. */
const USE_NOTED_MS = 60_000;

interface Entry {
  readonly record: TokenRecord;
  usedAt: number;
}

const NEVER_MATCHES = new Uint8Array(32);

export function createAuthenticator({ store, clock = Date.now }: AuthenticatorDeps): Authenticator {
  const entries = new Map<string, Entry>();
  /** Counts what the database told: a row read before it was told is not remembered. */
  let told = 0;
  const unsubscribe = store.notifications.subscribe((event) => {
    if (event.kind === 'TOKEN' || event.kind === 'LOST' || event.kind === 'RECONNECTED') told += 1;
    if (event.kind === 'LOST' || event.kind === 'RECONNECTED') entries.clear();
    if (event.kind !== 'TOKEN') return;
    for (const [lookup, { record }] of entries) if (record.id === event.id) entries.delete(lookup);
  });

  async function entryOf(lookup: string): Promise<Entry | null> {
    const known = entries.get(lookup);
    if (known !== undefined && store.notifications.connected) return known;
    const toldBefore = told;
    const record = await store.findToken(lookup);
    if (record === null) return null;
    const entry: Entry = { record, usedAt: 0 };
    if (store.notifications.connected && told === toldBefore) {
      if (entries.size >= CACHE_ENTRIES) entries.clear();
      entries.set(lookup, entry);
    }
    return entry;
  }

  function noteUse(entry: Entry): void {
    const now = clock();
    if (now - entry.usedAt < USE_NOTED_MS) return;
    entry.usedAt = now;
    // When a token was used last is a convenience: that it could not be written must not fail the request.
    store.noteTokenUse(entry.record.id).catch(() => {});
  }

  return {
    async authenticate(authorization) {
      if (authorization === undefined || authorization === '') throw unauthenticated('MISSING');
      const parts = tokenPartsOf(/^Bearer +(\S+)$/i.exec(authorization)?.[1] ?? '');
      if (parts === null) throw unauthenticated('MALFORMED');
      const entry = await entryOf(parts.lookup);
      const isRight = isSameHash(parts.secretHash, entry?.record.secretHash ?? NEVER_MATCHES);
      if (entry === null || !isRight) throw unauthenticated('UNKNOWN');
      const fault = faultOf(entry.record, clock());
      if (fault !== null) throw unauthenticated(fault);
      noteUse(entry);
      const { actor, role, id, expiresAt } = entry.record;
      return { actor, role, tokenId: id, expiresAt };
    },
    close: unsubscribe,
  };
}

function faultOf(record: TokenRecord, now: number): TokenFault | null {
  if (record.revokedAt !== null) return 'REVOKED';
  return record.expiresAt !== null && record.expiresAt.getTime() <= now ? 'EXPIRED' : null;
}
