/** The shape of resolvers. */
import type { GraphQLFieldResolver } from 'graphql';
import type { GraphqlContext } from '../context.ts';

/** Parents and arguments are those of the schema; each resolver states its own. */
export type Resolve = GraphQLFieldResolver<never, GraphqlContext, never>;

/** A subscription's field has two: where its events come from, and what an event is. */
export interface Watching {
  readonly subscribe: Resolve;
  readonly resolve: Resolve;
}

export type TypeResolvers = Readonly<Record<string, Resolve | Watching>>;

/** Arguments of a list without filter. */
export interface PageArgs {
  readonly first?: number | null;
  readonly after?: string | null;
}

/** A record that foreign keys promise: its absence is a defect, or a right that contradicts another. */
export function present<T>(record: T | null, what: string): T {
  if (record === null) throw new Error(`${what} is missing`);
  return record;
}
