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
export { JsonRefused, readJson } from './json-text.ts';
export { appliedWait, preferredWait } from './prefer.ts';
export { createTokenBuckets, type TokenBuckets } from './token-bucket.ts';
