/** What every resolver is given. */
import type { Viewer } from '../auth/index.ts';
import type { Operations } from '../operations/index.ts';
import type {
  ActorRecord,
  ChipRecord,
  ChipRevisionRecord,
  ConfigurationRecord,
  DesignRecord,
  ReleaseRecord,
  VersionRecord,
} from '../store/records.ts';
import type { Notifications } from '../store/store.ts';
import { createLoad, type Load } from './batch.ts';

/** By the bare ids that records carry. */
export interface Loads {
  readonly actor: Load<ActorRecord>;
  readonly chip: Load<ChipRecord>;
  readonly revision: Load<ChipRevisionRecord>;
  readonly design: Load<DesignRecord>;
  readonly configuration: Load<ConfigurationRecord>;
  readonly headRevision: Load<ChipRevisionRecord>;
  readonly latestVersion: Load<VersionRecord>;
  readonly releasesOfChip: Load<readonly ReleaseRecord[]>;
  readonly releasesOfVersion: Load<readonly ReleaseRecord[]>;
}

/** The part of the context that stays the same for every operation of a process. */
export interface Surroundings {
  readonly operations: Operations;
  readonly notifications: Notifications;
}

export interface GraphqlContext extends Surroundings {
  readonly viewer: Viewer;
  readonly load: Loads;
  /** Forgets what was loaded: the next event of a subscription is a new look. */
  renew(): void;
}

function createLoads(operations: Operations, viewer: Viewer): Loads {
  return {
    actor: createLoad((ids) => operations.actorsById(viewer, ids)),
    chip: createLoad((ids) => operations.chipsById(viewer, ids)),
    revision: createLoad((ids) => operations.revisionsById(viewer, ids)),
    design: createLoad((hashes) => operations.designsById(viewer, hashes)),
    configuration: createLoad((ids) => operations.configurationsById(viewer, ids)),
    headRevision: createLoad((chipIds) => operations.headRevisions(viewer, chipIds)),
    latestVersion: createLoad((ids) => operations.latestVersions(viewer, ids)),
    releasesOfChip: createLoad((chipIds) => operations.releasesOfChips(viewer, chipIds)),
    releasesOfVersion: createLoad((versionIds) => operations.releasesOfVersions(viewer, versionIds)),
  };
}

export function createContext(surroundings: Surroundings, viewer: Viewer): GraphqlContext {
  const { operations } = surroundings;
  let load = createLoads(operations, viewer);
  return {
    ...surroundings,
    viewer,
    get load() {
      return load;
    },
    renew() {
      load = createLoads(operations, viewer);
    },
  };
}
