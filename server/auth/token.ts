/**
 * Tokens: `rbt_<lookup>_<secret>`. The lookup finds the row; of the secret (256 random bits) only the SHA-256 is
 * stored. A fast hash suffices because the secret cannot be guessed from a list.
 */
import { createHash, randomBytes, timingSafeEqual } from 'node:crypto';

const TOKEN_PATTERN = /^rbt_([a-z0-9]{12})_([A-Za-z0-9_-]{43})$/;
/** 32 signs of the lookup's alphabet: 5 bits of a random byte choose one without bias. */
const LOOKUP_SIGNS = 'abcdefghijklmnopqrstuvwxyz234567';

export interface TokenParts {
  readonly lookup: string;
  readonly secretHash: Buffer;
}

function hashOf(secret: string): Buffer {
  return createHash('sha256').update(secret, 'ascii').digest();
}

/** Null: not in the form of a token. */
export function tokenPartsOf(token: string): TokenParts | null {
  const match = TOKEN_PATTERN.exec(token);
  return match === null ? null : { lookup: match[1]!, secretHash: hashOf(match[2]!) };
}

export function generateToken(): { readonly token: string } & TokenParts {
  const lookup = [...randomBytes(12)].map((byte) => LOOKUP_SIGNS[byte & 31]).join('');
  const secret = randomBytes(32).toString('base64url');
  return { token: `rbt_${lookup}_${secret}`, lookup, secretHash: hashOf(secret) };
}

export function isSameHash(a: Uint8Array, b: Uint8Array): boolean {
  return a.length === b.length && timingSafeEqual(a, b);
}
