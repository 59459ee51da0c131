/**
 * Absent and null are the same on this wire: a client that fills a form with nulls means nothing by them. Members
 * that are null are left out, at every depth; entries of lists stay (and are refused by their rule).
 */
export function withoutNulls(value: unknown): unknown {
  if (Array.isArray(value)) return value.map(withoutNulls);
  if (typeof value !== 'object' || value === null) return value;
  const members = Object.entries(value).filter(([, member]) => member !== null && member !== undefined);
  return Object.fromEntries(members.map(([name, member]) => [name, withoutNulls(member)]));
}
