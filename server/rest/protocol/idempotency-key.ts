/** `Idempotency-Key`: 1 to 128 visible ASCII characters, with or without the quotes of a structured string (RFC 8941). */
const KEY = /^(?:"([\x21\x23-\x7e]{1,128})"|([\x21\x23-\x7e]{1,128}))$/;

/** Undefined when absent, null when it is no such key. */
export function readIdempotencyKey(
  header: string | readonly string[] | undefined,
): string | null | undefined {
  if (header === undefined) return undefined;
  if (typeof header !== 'string') return null;
  const found = KEY.exec(header.trim());
  return found ? (found[1] ?? found[2] ?? null) : null;
}
