/** The same edges for whole lists: one select a kind, however many records ask. */
import { type Action, may } from '../auth/index.ts';
import type { Context } from './context.ts';
import type { Operations } from './operations.ts';

type ManyEdges = Pick<
  Operations,
  | 'chipsById'
  | 'revisionsById'
  | 'designsById'
  | 'configurationsById'
  | 'headRevisions'
  | 'latestVersions'
  | 'releasesOfChips'
  | 'releasesOfVersions'
>;

type Find<R> = (ids: readonly string[]) => Promise<readonly R[]>;

/** One record a key. */
function keyed<R>(action: Action, find: Find<R>, keyOf: (record: R) => string) {
  return async (
    viewer: Parameters<typeof may>[0],
    ids: readonly string[],
  ): Promise<ReadonlyMap<string, R>> => {
    const records = may(viewer, action) && ids.length > 0 ? await find([...new Set(ids)]) : [];
    return new Map(records.map((record) => [keyOf(record), record]));
  };
}

/** Any number of records a key, in the order in which they were found. */
function grouped<R>(action: Action, find: Find<R>, keyOf: (record: R) => string) {
  return async (
    viewer: Parameters<typeof may>[0],
    ids: readonly string[],
  ): Promise<ReadonlyMap<string, readonly R[]>> => {
    const groups = new Map<string, R[]>();
    if (!may(viewer, action) || ids.length === 0) return groups;
    for (const record of await find([...new Set(ids)])) {
      const group = groups.get(keyOf(record));
      if (group === undefined) groups.set(keyOf(record), [record]);
      else group.push(record);
    }
    return groups;
  };
}

export function manyEdgeOperations({ store }: Context): ManyEdges {
  return {
    chipsById: keyed('chip.read', store.findChipsById, (chip) => chip.id),
    revisionsById: keyed('chip.read', store.findRevisionsById, (revision) => revision.id),
    designsById: keyed('design.read', store.findDesigns, (design) => design.id),
    configurationsById: keyed('configuration.read', store.findConfigurationsById, ({ id }) => id),
    headRevisions: keyed('chip.read', store.findHeadRevisions, (revision) => revision.chipId),
    latestVersions: keyed(
      'configuration.read',
      store.findLatestVersions,
      (version) => version.configurationId,
    ),
    releasesOfChips: grouped('release.read', store.listReleasesOfChips, (release) => release.chipId),
    releasesOfVersions: grouped(
      'release.read',
      store.listReleasesOfVersions,
      (release) => release.version.id,
    ),
  };
}
