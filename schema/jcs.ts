/**
 * JSON Canonicalization Scheme, RFC 8785: members sorted by UTF-16 code units (section 3.2.3), numbers and strings as
 * ECMAScript writes them (3.2.2), nothing between. What is not JSON is refused instead of written as something else.
 */

/** @throws TypeError for numbers that are not finite, lone surrogates, and values that are not JSON */
export function canonicalJson(value: unknown): string {
  if (value === null || typeof value === 'boolean') return String(value);
  if (typeof value === 'number') {
    if (!Number.isFinite(value)) throw new TypeError(`${value} is not a JSON number`);
    return JSON.stringify(value);
  }
  if (typeof value === 'string') return canonicalString(value);
  if (Array.isArray(value)) return `[${value.map(canonicalJson).join()}]`;
  if (typeof value !== 'object') throw new TypeError(`a ${typeof value} is not JSON`);
  const members = Object.entries(value).filter(([, member]) => member !== undefined);
  // The default order of strings is that of their UTF-16 code units.
  members.sort(([a], [b]) => (a < b ? -1 : 1));
  return `{${members.map(([name, member]) => `${canonicalString(name)}:${canonicalJson(member)}`).join()}}`;
}

function canonicalString(text: string): string {
  if (/\p{Surrogate}/u.test(text)) throw new TypeError('a string has a lone surrogate');
  return JSON.stringify(text);
}
