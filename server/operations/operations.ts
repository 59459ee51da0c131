/**
 * Everything the service does, once, for both doors. Every operation takes who asks; those that take a body take it
 * unread (`unknown`), check it by the rules of `schema/` and throw `ProblemError` for everything that is refused.
 * Bodies have the members of the GraphQL inputs; REST handlers put what stands in the URL or in a header into them.
 * Answers are store records; `server/views` makes wire shapes of them.
 */
import type { Limits } from '../../schema/limits.ts';
import type { Problem } from '../../schema/problem.ts';
import type { ChipModel } from '../../src/chip/model.ts';
import type { Netlist } from '../../src/circuit/circuit.ts';
import type { FilterSpecification, OutputPort } from '../../src/filter/specification.ts';
import type { Figures, Stage } from '../../src/response/response.ts';
import type { Viewer } from '../auth/index.ts';
import type {
  ActorRecord,
  ChipRecord,
  ChipRevisionRecord,
  ConfigurationRecord,
  DesignRecord,
  HistoryRecord,
  ReleaseRecord,
  RequestState,
  TokenRecord,
  VersionRecord,
} from '../store/records.ts';
import type { ReleaseHead } from '../store/store.ts';

/** What came beside the body. A key in the header and one in the body must agree. */
export interface WriteOptions {
  readonly idempotencyKey?: string;
}

/** `replayed`: the idempotency key had been used for this very request; nothing was written now. */
export interface Done<T> {
  readonly record: T;
  readonly replayed: boolean;
}

/** Arguments of a list as they arrived. */
export interface ListAsk {
  readonly first?: unknown;
  readonly after?: unknown;
  readonly filter?: unknown;
  readonly order?: unknown;
}

export interface Connection<T> {
  readonly edges: readonly { readonly cursor: string; readonly node: T }[];
  readonly pageInfo: {
    readonly hasNextPage: boolean;
    readonly hasPreviousPage: boolean;
    readonly startCursor: string | null;
    readonly endCursor: string | null;
  };
}

/**
 * One person's ask. A hit that wrote nothing is one too: DONE, `cached`, its id made of the design's, made by nobody.
 * `problem` speaks in the units and pointers of `asked`.
 */
export interface DesignRequest {
  /** Wire id, `req_…`. */
  readonly id: string;
  readonly cached: boolean;
  readonly state: RequestState;
  readonly progress: number;
  readonly chipId: string;
  readonly chipRevisionId: string;
  readonly asked: unknown;
  readonly computationId: string | null;
  readonly designId: string | null;
  /** Set where the operation had the design at hand anyway. */
  readonly design?: DesignRecord;
  readonly problem: Problem | null;
  readonly createdAt: Date;
  readonly createdBy: string | null;
  readonly finishedAt: Date | null;
}

export interface SpecificationCheck {
  readonly ok: boolean;
  readonly problem: Problem | null;
  readonly order: number | null;
  readonly rings: number | null;
  /** Canonical, with the revision it was made for; null when the body was not understood. */
  readonly specification: FilterSpecification | null;
  readonly revision: ChipRevisionRecord | null;
  readonly designHash: string | null;
  readonly cached: boolean;
}

/** A curve on the wire's grid. Lists of equal length; `null` in delay or dispersion is explained in `gaps`. */
export interface Curve {
  readonly stage: Stage;
  readonly output: OutputPort;
  readonly frequencyThz: readonly number[];
  readonly wavelengthNm: readonly number[];
  readonly offsetGhz: readonly number[];
  readonly field: { readonly re: readonly number[]; readonly im: readonly number[] };
  /** Never below `floorDb`. */
  readonly transmissionDb: readonly number[];
  readonly floorDb: number;
  readonly phaseRad: readonly number[];
  readonly groupDelayPs: readonly (number | null)[];
  readonly dispersionPsPerNm: readonly (number | null)[];
  readonly gaps: readonly { readonly from: number; readonly to: number; readonly reason: string }[];
  readonly reduced: boolean;
}

export type NodeRecord =
  | { readonly type: 'Chip'; readonly record: ChipRecord }
  | { readonly type: 'ChipRevision'; readonly record: ChipRevisionRecord }
  | { readonly type: 'DesignRequest'; readonly record: DesignRequest }
  | { readonly type: 'Design'; readonly record: DesignRecord }
  | { readonly type: 'Configuration'; readonly record: ConfigurationRecord }
  | { readonly type: 'ConfigurationVersion'; readonly record: VersionRecord }
  | { readonly type: 'Release'; readonly record: ReleaseRecord }
  | { readonly type: 'Actor'; readonly record: ActorRecord }
  | { readonly type: 'Token'; readonly record: TokenRecord }
  | { readonly type: 'HistoryEntry'; readonly record: HistoryRecord };

export interface ServiceInfo {
  readonly version: string;
  readonly engineVersion: string;
  readonly limits: Limits;
}

export interface Operations {
  readonly limits: Limits;

  me(viewer: Viewer): Viewer;
  service(viewer: Viewer): ServiceInfo;
  /** Unknown, malformed or hidden ids: null. */
  node(viewer: Viewer, id: string): Promise<NodeRecord | null>;

  findChip(viewer: Viewer, serial: string): Promise<ChipRecord | null>;
  listChips(viewer: Viewer, ask: ListAsk): Promise<Connection<ChipRecord>>;
  findRevision(viewer: Viewer, chip: ChipRecord, number: number): Promise<ChipRevisionRecord | null>;
  headRevision(viewer: Viewer, chip: ChipRecord): Promise<ChipRevisionRecord>;
  listRevisions(viewer: Viewer, chip: ChipRecord, ask: ListAsk): Promise<Connection<ChipRevisionRecord>>;
  /** The canonical model of a revision; memoised. */
  modelOf(revision: ChipRevisionRecord): ChipModel;
  /** RegisterChipInput. */
  registerChip(viewer: Viewer, body: unknown, options?: WriteOptions): Promise<Done<ChipRecord>>;
  /** ReviseChipInput. The same content answers the head revision. */
  reviseChip(viewer: Viewer, body: unknown, options?: WriteOptions): Promise<Done<ChipRevisionRecord>>;

  /** RequestDesignInput. Refused at once: throws, nothing stored. Otherwise a request in whatever state it is. */
  requestDesign(viewer: Viewer, body: unknown, options?: WriteOptions): Promise<DesignRequest>;
  /** RequestDesignInput; a refusal is an answer here (`ok: false`). Unknown chips still throw. */
  checkSpecification(viewer: Viewer, body: unknown): Promise<SpecificationCheck>;
  /** CancelDesignRequestInput. */
  cancelDesignRequest(viewer: Viewer, body: unknown): Promise<DesignRequest>;
  findRequest(viewer: Viewer, id: string): Promise<DesignRequest | null>;
  /** filter: DesignRequestFilter. */
  listRequests(viewer: Viewer, ask: ListAsk): Promise<Connection<DesignRequest>>;

  /** `dsn_…`. */
  findDesign(viewer: Viewer, id: string): Promise<DesignRecord | null>;
  /** filter: DesignFilter, order: DesignOrder. */
  listDesigns(viewer: Viewer, ask: ListAsk): Promise<Connection<DesignRecord>>;
  listVersionsOfDesign(
    viewer: Viewer,
    design: DesignRecord,
    ask: ListAsk,
  ): Promise<Connection<VersionRecord>>;
  /** ask: `{stage?, output?, grid?, reduceTo?}` (CurveInput). Grid absent: one FSR around the reference, 2,001 points. */
  designCurve(viewer: Viewer, design: DesignRecord, ask: unknown): Promise<Curve>;
  /** ask: `{stage?, output?}`. */
  designFigures(viewer: Viewer, design: DesignRecord, ask: unknown): Promise<Figures>;
  designNetlist(viewer: Viewer, design: DesignRecord): Promise<Netlist>;

  findConfiguration(viewer: Viewer, chip: ChipRecord, name: string): Promise<ConfigurationRecord | null>;
  listConfigurations(
    viewer: Viewer,
    chip: ChipRecord,
    ask: ListAsk,
  ): Promise<Connection<ConfigurationRecord>>;
  findVersion(
    viewer: Viewer,
    configuration: ConfigurationRecord,
    number: number,
  ): Promise<VersionRecord | null>;
  latestVersion(viewer: Viewer, configuration: ConfigurationRecord): Promise<VersionRecord | null>;
  listVersions(
    viewer: Viewer,
    configuration: ConfigurationRecord,
    ask: ListAsk,
  ): Promise<Connection<VersionRecord>>;
  /** SaveVersionInput. */
  saveVersion(viewer: Viewer, body: unknown, options?: WriteOptions): Promise<Done<VersionRecord>>;

  /** The pull: whether there is news. */
  findReleaseHead(viewer: Viewer, serial: string, name: string): Promise<ReleaseHead | null>;
  /** One release of all there were. */
  findReleaseBySequence(
    viewer: Viewer,
    chipId: string,
    name: string,
    sequence: number,
  ): Promise<ReleaseRecord | null>;
  findRelease(viewer: Viewer, serial: string, name: string): Promise<ReleaseRecord | null>;
  /** Every release name of the chip with what it points at now. */
  listReleases(viewer: Viewer, chip: ChipRecord): Promise<readonly ReleaseRecord[]>;
  listReleaseLog(
    viewer: Viewer,
    chip: ChipRecord,
    name: string,
    ask: ListAsk,
  ): Promise<Connection<ReleaseRecord>>;
  listReleasesOfVersion(viewer: Viewer, version: VersionRecord): Promise<readonly ReleaseRecord[]>;
  /** PublishReleaseInput; `expectedSequence` 0: only the first. */
  publishRelease(viewer: Viewer, body: unknown, options?: WriteOptions): Promise<Done<ReleaseRecord>>;

  listTokens(viewer: Viewer): Promise<readonly TokenRecord[]>;
  /** CreateTokenInput. The secret is shown this once. */
  createToken(
    viewer: Viewer,
    body: unknown,
  ): Promise<{ readonly record: TokenRecord; readonly secret: string }>;
  /** RevokeTokenInput. */
  revokeToken(viewer: Viewer, body: unknown): Promise<TokenRecord>;
  /** filter: HistoryFilter. */
  listHistory(viewer: Viewer, ask: ListAsk): Promise<Connection<HistoryRecord>>;

  /** Edges of the graph, by the bare ids that records carry; each asks `authorise` like every other door. */
  chipById(viewer: Viewer, id: string): Promise<ChipRecord | null>;
  revisionById(viewer: Viewer, id: string): Promise<ChipRevisionRecord | null>;
  designById(viewer: Viewer, hash: string): Promise<DesignRecord | null>;
  configurationById(viewer: Viewer, id: string): Promise<ConfigurationRecord | null>;
  versionById(viewer: Viewer, id: string): Promise<VersionRecord | null>;
  actorsById(viewer: Viewer, ids: readonly string[]): Promise<ReadonlyMap<string, ActorRecord>>;
  /** Many at once, one select each; what is unknown or hidden is not in the map. */
  chipsById(viewer: Viewer, ids: readonly string[]): Promise<ReadonlyMap<string, ChipRecord>>;
  revisionsById(viewer: Viewer, ids: readonly string[]): Promise<ReadonlyMap<string, ChipRevisionRecord>>;
  designsById(viewer: Viewer, hashes: readonly string[]): Promise<ReadonlyMap<string, DesignRecord>>;
  configurationsById(
    viewer: Viewer,
    ids: readonly string[],
  ): Promise<ReadonlyMap<string, ConfigurationRecord>>;
  /** By the id of the chip. */
  headRevisions(viewer: Viewer, chipIds: readonly string[]): Promise<ReadonlyMap<string, ChipRevisionRecord>>;
  /** By the id of the configuration. */
  latestVersions(
    viewer: Viewer,
    configurationIds: readonly string[],
  ): Promise<ReadonlyMap<string, VersionRecord>>;
  /** By the id of the chip: where each of its release names points now. */
  releasesOfChips(
    viewer: Viewer,
    chipIds: readonly string[],
  ): Promise<ReadonlyMap<string, readonly ReleaseRecord[]>>;
  /** By the id of the version, the newest first. */
  releasesOfVersions(
    viewer: Viewer,
    versionIds: readonly string[],
  ): Promise<ReadonlyMap<string, readonly ReleaseRecord[]>>;
  /** Bare uuid of a stored request, as notifications carry it. */
  requestByUuid(viewer: Viewer, uuid: string): Promise<DesignRequest | null>;
}
