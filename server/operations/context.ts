/** What the operations share: the store, the clock, and the revisions this process has seen. */
import { type ChipModelInput, chipModelOf } from '../../schema/chip.ts';
import type { Limits } from '../../schema/limits.ts';
import type { ChipModel } from '../../src/chip/index.ts';
import { notFound } from '../errors.ts';
import type { ChipRecord, ChipRevisionRecord, DesignRecord } from '../store/records.ts';
import type { Store } from '../store/store.ts';

export interface OperationsDeps {
  readonly store: Store;
  /** Version of the service, as its package states it. */
  readonly version: string;
  readonly limits?: Partial<Limits>;
  /** Milliseconds since 1970. */
  readonly clock?: () => number;
}

export interface Context {
  readonly store: Store;
  readonly limits: Limits;
  readonly clock: () => number;
  readonly version: string;
  /** By its hash; immutable, so remembered: one that retention deletes may be answered until it is forgotten. */
  findDesign(hash: string): Promise<DesignRecord | null>;
  /** Immutable, so remembered. */
  revisionById(id: string): Promise<ChipRevisionRecord | null>;
  headRevision(chip: ChipRecord): Promise<ChipRevisionRecord>;
  modelOf(revision: ChipRevisionRecord): ChipModel;
  /** @throws ProblemError NOT_FOUND at `/chip` */
  chipBySerial(serial: string): Promise<ChipRecord>;
}

/** A map that forgets what was not used for longest. */
function recentMap<K, V>(entries: number): Pick<Map<K, V>, 'get' | 'set'> {
  const map = new Map<K, V>();
  return {
    get(key) {
      const value = map.get(key);
      if (value === undefined) return undefined;
      map.delete(key);
      map.set(key, value);
      return value;
    },
    set(key, value) {
      map.delete(key);
      map.set(key, value);
      if (map.size > entries) map.delete(map.keys().next().value as K);
      return map;
    },
  };
}

/** Designs remembered; each holds some 100 kB. */
const REMEMBERED_DESIGNS = 100;

/** Revisions remembered; each may be 0.7 MB with a full crosstalk matrix of 256 channels. */
const REMEMBERED_REVISIONS = 64;

export function createContext(deps: OperationsDeps, limits: Limits): Context {
  const { store, version, clock = Date.now } = deps;
  const byId = recentMap<string, ChipRevisionRecord>(REMEMBERED_REVISIONS);
  const byNumber = recentMap<string, ChipRevisionRecord>(REMEMBERED_REVISIONS);
  const designs = recentMap<string, DesignRecord>(REMEMBERED_DESIGNS);
  const models = new WeakMap<ChipModelInput, ChipModel>();

  function remember(record: ChipRevisionRecord): ChipRevisionRecord {
    byId.set(record.id, record);
    byNumber.set(`${record.chipId}/${record.number}`, record);
    return record;
  }

  return {
    store,
    limits,
    clock,
    version,
    async findDesign(hash) {
      const known = designs.get(hash);
      if (known !== undefined) return known;
      const found = await store.findDesign(hash);
      if (found !== null) designs.set(hash, found);
      return found;
    },
    async revisionById(id) {
      const known = byId.get(id);
      if (known !== undefined) return known;
      const found = await store.findRevisionById(id);
      return found && remember(found);
    },
    async headRevision(chip) {
      const known = byNumber.get(`${chip.id}/${chip.headRevision}`);
      if (known !== undefined) return known;
      const found = await store.findRevision(chip.id, chip.headRevision);
      if (found === null) throw new Error(`chip ${chip.id} has no head revision`);
      return remember(found);
    },
    modelOf(revision) {
      const known = models.get(revision.model);
      if (known !== undefined) return known;
      const model = chipModelOf(revision.model);
      models.set(revision.model, model);
      return model;
    },
    async chipBySerial(serial) {
      const chip = await store.findChip(serial);
      if (chip === null) throw notFound(`chip ${serial}`, '/chip', serial);
      return chip;
    },
  };
}
