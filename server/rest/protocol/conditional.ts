/**
 * Entity tags and preconditions, RFC 9110 sections 8.8.3 (tags and their comparison) and 13 (If-Match, If-None-Match,
 * precedence). Dates are not validators here: everything with a tag changes more often than once a second can tell.
 */

/** `*`, or the tags as they were sent, quotes and `W/` included. */
export type TagList = '*' | readonly string[];

/** entity-tag of section 8.8.3: `W/` is case-sensitive, no spaces or quotes inside. */
const ENTITY_TAG = /^(?:W\/)?"[\x21\x23-\x7e\x80-\xff]*"/;

/** Null when the header is not a list of entity tags or a single `*` (section 13.1.2: `*` among others is invalid). */
export function parseTagList(header: string): TagList | null {
  let rest = header.trim();
  if (rest === '*') return '*';
  const tags: string[] = [];
  while (rest !== '') {
    const found = ENTITY_TAG.exec(rest);
    if (!found) return null;
    tags.push(found[0]);
    rest = rest.slice(found[0].length).trimStart();
    if (rest === '') break;
    if (!rest.startsWith(',')) return null;
    rest = rest.replace(/^[\s,]+/, '');
  }
  return tags.length > 0 ? tags : null;
}

const opaque = (tag: string): string => (tag.startsWith('W/') ? tag.slice(2) : tag);

/** Section 8.8.3.2: equal opaque tags, whether weak or not. */
export const equalsWeakly = (a: string, b: string): boolean => opaque(a) === opaque(b);

/** Section 8.8.3.2: equal and neither weak. */
export const equalsStrongly = (a: string, b: string): boolean => a === b && !a.startsWith('W/');

/** If-None-Match fails (304 for GET and HEAD, 412 otherwise) when this is true. `current` null: no representation. */
export function matchesAny(list: TagList, current: string | null): boolean {
  if (current === null) return false;
  return list === '*' || list.some((tag) => equalsWeakly(tag, current));
}

/**
 * The present tag that If-Match names, of the tags that the present state has (one a representation); null when none
 * does, which fails the precondition. `*` names the first.
 */
export function matchedStrongly(list: TagList, present: readonly string[]): string | null {
  if (list === '*') return present[0] ?? null;
  return present.find((tag) => list.some((asked) => equalsStrongly(asked, tag))) ?? null;
}

export interface Preconditions {
  readonly ifMatch?: TagList;
  readonly ifNoneMatch?: TagList;
}

export type PreconditionVerdict = 'PROCEED' | 'NOT_MODIFIED' | 'FAILED';

/**
 * Section 13.2.2, in its order, for a GET or HEAD of an existing representation. A missing one is 404 whatever the
 * preconditions say (section 13.2.1) and never comes here.
 */
export function evaluateRead(preconditions: Preconditions, current: string): PreconditionVerdict {
  const { ifMatch, ifNoneMatch } = preconditions;
  if (ifMatch && matchedStrongly(ifMatch, [current]) === null) return 'FAILED';
  if (ifNoneMatch && matchesAny(ifNoneMatch, current)) return 'NOT_MODIFIED';
  return 'PROCEED';
}
