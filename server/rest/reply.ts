/** The few ways in which handlers answer. */
import { createHash } from 'node:crypto';
import type { FastifyReply, FastifyRequest } from 'fastify';
import { badInput, refuse } from '../errors.ts';
import { evaluateRead, negotiate, parseTagList, type TagList } from './protocol/index.ts';

export const JSON_TYPE = 'application/json';

/** What one representation of one state is: the tag names the bytes, so it must change whenever they do. */
export interface TaggedAnswer {
  readonly etag: string;
  readonly mediaType: string;
  /** Called for 200 only. */
  readonly render: () => string | Promise<string | Buffer>;
  readonly fileName?: string;
}

export function tagsOf(request: FastifyRequest, header: 'if-match' | 'if-none-match'): TagList | undefined {
  const text = request.headers[header];
  if (text === undefined) return undefined;
  const list = parseTagList(text);
  if (list) return list;
  throw badInput(
    `${header === 'if-match' ? 'If-Match' : 'If-None-Match'} must be "*" or a list of entity tags in double quotes.`,
    {
      given: text.slice(0, 200),
    },
  );
}

/** 200, 304 or 412 by the preconditions of RFC 9110 section 13. A 304 repeats ETag, Vary and Cache-Control. */
export async function answerTagged(
  request: FastifyRequest,
  reply: FastifyReply,
  answer: TaggedAnswer,
): Promise<FastifyReply> {
  const ifMatch = tagsOf(request, 'if-match');
  const ifNoneMatch = tagsOf(request, 'if-none-match');
  const verdict = evaluateRead(
    { ...(ifMatch ? { ifMatch } : {}), ...(ifNoneMatch ? { ifNoneMatch } : {}) },
    answer.etag,
  );
  if (verdict === 'FAILED') throw preconditionFailed(answer.etag);
  reply.header('etag', answer.etag);
  if (verdict === 'NOT_MODIFIED') return reply.code(304).send();
  if (answer.fileName !== undefined) {
    // By construction a name of letters, digits and "._-": nothing to escape.
    reply.header('content-disposition', `inline; filename="${answer.fileName}"`);
  }
  return reply.header('content-type', answer.mediaType).send(await answer.render());
}

export function preconditionFailed(present: string | null) {
  const detail =
    present === null
      ? 'There is no such record yet.'
      : `The present entity tag is ${present}; read again, decide again.`;
  return refuse('PRECONDITION_FAILED', detail, { pointer: '', allowed: { etag: present } });
}

/** Length of a hash in a tag: 48 bits tell two contents of one record apart. */
export const TAG_HASH_DIGITS = 12;

export function answerJson(
  request: FastifyRequest,
  reply: FastifyReply,
  value: unknown,
): Promise<FastifyReply> {
  const text = JSON.stringify(value);
  const hash = createHash('sha256').update(text).digest('hex').slice(0, TAG_HASH_DIGITS);
  return answerTagged(request, reply, { etag: `"${hash}.json1"`, mediaType: JSON_TYPE, render: () => text });
}

/** A created record: 201, or 200 when the idempotency key had made it before. */
export function answerWritten(
  reply: FastifyReply,
  created: boolean,
  location: string,
  etag: string,
  text: string,
): FastifyReply {
  return reply
    .code(created ? 201 : 200)
    .headers({ location, etag, 'content-type': JSON_TYPE })
    .send(text);
}

export interface Offer {
  readonly suffix: string;
  readonly mediaType: string;
  /** Sent as Content-Type; the media type with its parameters. */
  readonly contentType: string;
}

export const JSON_OFFER: Offer = { suffix: 'json', mediaType: JSON_TYPE, contentType: JSON_TYPE };
export const CSV_OFFER: Offer = {
  suffix: 'csv',
  mediaType: 'text/csv',
  contentType: 'text/csv; charset=utf-8; header=present',
};

/** The representation to send: the path's suffix if it has one, else what Accept likes best; 406 when it likes none. */
export function representationFor<T extends Offer>(
  request: FastifyRequest,
  offers: readonly T[],
  suffix: string | null,
): T {
  const bySuffix = offers.find((offer) => offer.suffix === suffix);
  if (bySuffix) return bySuffix;
  const { accept } = request.headers;
  const chosen = negotiate(accept, offers);
  if (chosen) return chosen;
  throw refuse('NOT_ACCEPTABLE', `${accept} is not on offer here.`, {
    given: accept ?? null,
    allowed: offers.map((offer) => ({ mediaType: offer.mediaType, suffix: `.${offer.suffix}` })),
  });
}
