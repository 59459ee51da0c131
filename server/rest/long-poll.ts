/** `Prefer: wait=N` on top of `waiting.ts`: what the request says, who waits, and what an ended token means. */
import type { FastifyReply, FastifyRequest } from 'fastify';
import { viewerOf } from './frame/index.ts';
import { appliedWait, preferredWait } from './protocol/index.ts';
import type { RestDeps } from './rest.ts';

export interface LongPoll<T> {
  readonly topic: string;
  readonly seconds: number;
  readonly read: () => Promise<T>;
  readonly isSettled: (value: T) => boolean;
}

/** Seconds this request would wait; null: it did not ask to. */
export const waitOf = (request: FastifyRequest): number | null => preferredWait(request.headers.prefer);

/** Aborts when the client has gone before the answer was written. */
function whenGone(reply: FastifyReply): AbortSignal {
  const gone = new AbortController();
  reply.raw.once('close', () => gone.abort());
  return gone.signal;
}

/**
 * Waits, says so in `Preference-Applied`, and answers the last state read. Null: as many long polls of this token are
 * open as may be. Throws UNAUTHENTICATED when the token ended meanwhile, SERVICE_UNAVAILABLE when the database did.
 */
export async function longPoll<T>(
  request: FastifyRequest,
  reply: FastifyReply,
  { authenticator, waiting }: RestDeps,
  poll: LongPoll<T>,
): Promise<{ readonly value: T } | null> {
  const viewer = viewerOf(request);
  const wait = waiting.wait({
    ...poll,
    tokenId: viewer.tokenId,
    tokenExpiresAt: viewer.expiresAt,
    signal: whenGone(reply),
  });
  if (wait === null) return null;
  const { end, value } = await wait;
  if (end === 'TOKEN_ENDED') await authenticator.authenticate(request.headers.authorization);
  reply.header('preference-applied', appliedWait(poll.seconds));
  return { value };
}
