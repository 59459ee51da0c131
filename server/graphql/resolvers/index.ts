/** What stands behind the fields of the schema, by type. Types that are not here have plain members only. */
import { Chip, ChipRevision } from './chip.ts';
import { Circuit, Design } from './design.ts';
import { DesignRequest } from './design-request.ts';
import { Configuration, ConfigurationVersion, Release } from './library.ts';
import { Mutation } from './mutation.ts';
import { HistoryEntry, Token } from './people.ts';
import { Query, Viewer } from './query.ts';
import type { TypeResolvers } from './resolve.ts';
import { SpecificationCheck } from './specification.ts';
import { Subscription } from './subscription.ts';

export type { TypeResolvers } from './resolve.ts';

export const RESOLVERS: Readonly<Record<string, TypeResolvers>> = {
  Query,
  Mutation,
  Subscription,
  Chip,
  ChipRevision,
  Design,
  Circuit,
  DesignRequest,
  SpecificationCheck,
  Configuration,
  ConfigurationVersion,
  Release,
  Token,
  HistoryEntry,
  Viewer,
};
