/**
 * Everything the server asks of PostgreSQL. One operation a file beside this one; transactions begin and end inside an
 * operation. What can go wrong in the library's own terms is a value in the result (a union on `outcome`), what goes
 * wrong with the database is thrown (`StoreUnavailable` when it is away).
 */
import type { ChipModelInput } from '../../schema/chip.ts';
import type { Problem } from '../../schema/problem.ts';
import type { Setting } from '../../src/chip/index.ts';
import type { Design } from '../../src/design/index.ts';
import type {
  Acting,
  ActorKind,
  ActorRecord,
  ChipRecord,
  ChipRevisionRecord,
  ComputationRecord,
  ConfigurationRecord,
  DesignRecord,
  HistoryRecord,
  Idempotency,
  Page,
  PageAsk,
  ReleaseRecord,
  RequestRecord,
  RequestState,
  Role,
  TokenRecord,
  VersionRecord,
} from './records.ts';

/** Outcome of any write that carried an idempotency key already used with another body. */
export interface KeyReused {
  readonly outcome: 'KEY_REUSED';
}

export type Written<T> = { readonly outcome: 'WRITTEN'; readonly record: T; readonly replayed: boolean };

export interface DesignFilter {
  readonly chipId?: string;
  readonly family?: string;
  readonly architecture?: string;
  readonly met?: boolean;
  readonly minRejectionDb?: number;
  readonly maxInsertionLossDb?: number;
  readonly createdAfter?: Date;
  readonly createdBefore?: Date;
}

export interface Who {
  findToken(lookup: string): Promise<TokenRecord | null>;
  findTokenById(id: string): Promise<TokenRecord | null>;
  listTokens(): Promise<readonly TokenRecord[]>;
  /** Creates the actor by name if need be. NAME_TAKEN: the name exists with another kind. */
  createToken(
    by: Acting,
    ask: {
      actor: string;
      actorKind: ActorKind;
      role: Role;
      label: string;
      expiresAt: Date | null;
      lookup: string;
      secretHash: Buffer;
    },
  ): Promise<Written<TokenRecord> | { readonly outcome: 'NAME_TAKEN' }>;
  revokeToken(
    by: Acting,
    id: string,
  ): Promise<Written<TokenRecord> | { readonly outcome: 'NOT_FOUND' | 'LAST_ADMIN' }>;
  /** At most one write a minute and token. */
  noteTokenUse(id: string): Promise<void>;
  /** First start: makes the SYSTEM actor and the first admin token; true only for the process that won. */
  bootstrapAdmin(ask: { lookup: string; secretHash: Buffer }): Promise<boolean>;
  findActors(ids: readonly string[]): Promise<readonly ActorRecord[]>;
}

export interface Chips {
  findChip(serial: string): Promise<ChipRecord | null>;
  findChipById(id: string): Promise<ChipRecord | null>;
  /** In any order, unknown ids left out; so everywhere where many are asked for at once. */
  findChipsById(ids: readonly string[]): Promise<readonly ChipRecord[]>;
  listChips(page: PageAsk): Promise<Page<ChipRecord>>;
  findRevision(chipId: string, number: number): Promise<ChipRevisionRecord | null>;
  findRevisionById(id: string): Promise<ChipRevisionRecord | null>;
  findRevisionsById(ids: readonly string[]): Promise<readonly ChipRevisionRecord[]>;
  findHeadRevisions(chipIds: readonly string[]): Promise<readonly ChipRevisionRecord[]>;
  listRevisions(chipId: string, page: PageAsk): Promise<Page<ChipRevisionRecord>>;
  registerChip(
    by: Acting,
    ask: { serial: string; description: string; model: ChipModelInput; canonical: string; hash: string },
    idempotency?: Idempotency,
  ): Promise<Written<ChipRecord> | KeyReused | { readonly outcome: 'NAME_TAKEN' }>;
  /** Same content as the head: answers the head revision without a write. */
  reviseChip(
    by: Acting,
    ask: {
      chipId: string;
      expectedRevision: number;
      model: ChipModelInput;
      note: string;
      canonicalOf: (number: number) => { canonical: string; hash: string };
    },
    idempotency?: Idempotency,
  ): Promise<
    Written<ChipRevisionRecord> | KeyReused | { readonly outcome: 'STALE'; readonly headRevision: number }
  >;
}

export interface SubmitAsk {
  readonly chipId: string;
  readonly chipRevisionId: string;
  readonly asked: unknown;
  readonly key: string;
  readonly canonical: string;
  readonly engine: string;
}

export type Submitted =
  | { readonly outcome: 'DESIGN'; readonly design: DesignRecord }
  | { readonly outcome: 'REFUSAL'; readonly problem: Problem }
  | Written<RequestRecord>
  | KeyReused
  | { readonly outcome: 'TOO_MANY_OPEN' | 'QUEUE_FULL' };

export interface Designs {
  /** The fast path: one prepared select. */
  findDesign(id: string): Promise<DesignRecord | null>;
  findDesigns(ids: readonly string[]): Promise<readonly DesignRecord[]>;
  findRefusal(id: string): Promise<Problem | null>;
  listDesigns(
    filter: DesignFilter,
    order: 'NEWEST' | 'REJECTION',
    page: PageAsk,
  ): Promise<Page<DesignRecord>>;
  /** With an idempotency key a row is always written, a hit included; without one a hit writes nothing. */
  submitRequest(
    by: Acting,
    ask: SubmitAsk,
    limits: { openPerToken: number; queue: number },
    idempotency?: Idempotency,
  ): Promise<Submitted>;
  findRequest(id: string): Promise<RequestRecord | null>;
  listRequests(
    filter: { chipId?: string; states?: readonly RequestState[]; createdBy?: string },
    page: PageAsk,
  ): Promise<Page<RequestRecord>>;
  /** Ends the ask; the computation ends with its last asker. A repeat by anybody allowed answers the same. */
  cancelRequest(
    by: Acting,
    id: string,
  ): Promise<
    | Written<RequestRecord>
    | { readonly outcome: 'NOT_FOUND' }
    | { readonly outcome: 'FINISHED'; readonly record: RequestRecord }
  >;
}

export interface Computations {
  /** Marks it running and raises the attempt (the fence). Null: cancelled or finished meanwhile. */
  startComputation(id: string): Promise<(ComputationRecord & { readonly model: ChipModelInput }) | null>;
  /** False: fenced off. Callers keep to 2 a second. */
  reportProgress(id: string, attempt: number, progress: number): Promise<boolean>;
  finishComputation(id: string, attempt: number, design: Design, resultHash: string): Promise<boolean>;
  refuseComputation(id: string, attempt: number, problem: Problem): Promise<boolean>;
  /** Worker liveness: row and session lock on a connection of its own. */
  registerWorker(poolIds: readonly string[], engine: string): Promise<{ release(): Promise<void> }>;
  /** Frees the jobs of dead workers, fails what the queue will not run again, retires unserved engines. */
  sweep(): Promise<{ freed: number; failed: number }>;
  queueDepth(): Promise<{ queued: number; running: number }>;
}

export interface Configurations {
  findConfiguration(chipId: string, name: string): Promise<ConfigurationRecord | null>;
  findConfigurationById(id: string): Promise<ConfigurationRecord | null>;
  findConfigurationsById(ids: readonly string[]): Promise<readonly ConfigurationRecord[]>;
  listConfigurations(chipId: string, page: PageAsk): Promise<Page<ConfigurationRecord>>;
  findVersion(configurationId: string, number: number): Promise<VersionRecord | null>;
  findVersionById(id: string): Promise<VersionRecord | null>;
  /** The newest version of each. */
  findLatestVersions(configurationIds: readonly string[]): Promise<readonly VersionRecord[]>;
  listVersions(configurationId: string, page: PageAsk): Promise<Page<VersionRecord>>;
  listVersionsOfDesign(designId: string, page: PageAsk): Promise<Page<VersionRecord>>;
  saveVersion(
    by: Acting,
    ask: {
      chipId: string;
      configuration: string;
      designId: string;
      designRevisionId: string;
      setting: Setting;
      contentHash: string;
      expectedVersion?: number;
      note: string;
    },
    idempotency?: Idempotency,
  ): Promise<
    | Written<VersionRecord>
    | KeyReused
    | { readonly outcome: 'STALE_CHIP_REVISION'; readonly headRevision: number }
    | { readonly outcome: 'VERSION_MOVED'; readonly lastVersion: number }
  >;
}

/** What a release name points at now, without the setting. */
export interface ReleaseHead {
  readonly chipId: string;
  readonly name: string;
  readonly sequence: number;
  readonly contentHash: string;
}

export interface Releases {
  /** One prepared select of a few bytes. */
  findReleaseHead(chipSerial: string, name: string): Promise<ReleaseHead | null>;
  /** The pull: one prepared select. */
  findRelease(chipSerial: string, name: string): Promise<ReleaseRecord | null>;
  findReleaseBySequence(chipId: string, name: string, sequence: number): Promise<ReleaseRecord | null>;
  listReleases(chipId: string): Promise<readonly ReleaseRecord[]>;
  listReleasesOfChips(chipIds: readonly string[]): Promise<readonly ReleaseRecord[]>;
  listReleaseLog(chipId: string, name: string, page: PageAsk): Promise<Page<ReleaseRecord>>;
  listReleasesOfVersion(versionId: string): Promise<readonly ReleaseRecord[]>;
  listReleasesOfVersions(versionIds: readonly string[]): Promise<readonly ReleaseRecord[]>;
  /** `expectedSequence` 0: only if there is none yet. */
  publishRelease(
    by: Acting,
    ask: {
      chipId: string;
      name: string;
      versionId: string;
      expectedSequence?: number;
      note: string;
      accepted: readonly string[];
    },
    idempotency?: Idempotency,
  ): Promise<
    | Written<ReleaseRecord>
    | KeyReused
    | { readonly outcome: 'STALE_CHIP_REVISION'; readonly headRevision: number }
    | { readonly outcome: 'SEQUENCE_MOVED'; readonly sequence: number }
  >;
}

export interface History {
  listHistory(
    filter: { chipId?: string; actorId?: string; action?: string; after?: Date; before?: Date },
    page: PageAsk,
  ): Promise<Page<HistoryRecord>>;
  findHistoryEntry(id: string): Promise<HistoryRecord | null>;
}

/** What the database tells every process. Re-read on `RECONNECTED`: anything may have happened meanwhile. */
export type StoreEvent =
  | { readonly kind: 'COMPUTATION'; readonly id: string }
  | { readonly kind: 'CANCEL'; readonly id: string }
  | {
      readonly kind: 'RELEASE';
      readonly chipSerial: string;
      readonly name: string;
      readonly sequence: number;
    }
  | { readonly kind: 'TOKEN'; readonly id: string }
  | { readonly kind: 'LOST' }
  | { readonly kind: 'RECONNECTED' };

export interface Notifications {
  /** One LISTEN connection a process. */
  subscribe(listener: (event: StoreEvent) => void): () => void;
  readonly connected: boolean;
}

export interface Store extends Who, Chips, Designs, Computations, Configurations, Releases, History {
  readonly notifications: Notifications;
  /** The pool, for graphile-worker alone. */
  readonly pool: import('pg').Pool;
  ping(): Promise<boolean>;
  close(): Promise<void>;
}
