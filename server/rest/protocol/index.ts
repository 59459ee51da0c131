export { negotiate, type Representation, splitSuffix } from './accept.ts';
export {
  equalsStrongly,
  equalsWeakly,
  evaluateRead,
  matchedStrongly,
  matchesAny,
  type Preconditions,
  parseTagList,
  type TagList,
} from './conditional.ts';
export { readIdempotencyKey } from './idempotency-key.ts';
export { escapePointerToken, JsonRefused, readJson } from './json-text.ts';
export { appliedWait, LONGEST_WAIT_S, preferredWait } from './prefer.ts';
export { createTokenBuckets, type TokenBuckets } from './token-bucket.ts';
