/** Rows as the rest of the server sees them: camelCase, dates as Date, JSON parsed. Ids here are bare uuids; the wire adds prefixes. */
import type { ChipModelInput } from '../../schema/chip.ts';
import type { Problem } from '../../schema/problem.ts';
import type { Setting } from '../../src/chip/index.ts';
import type { Design } from '../../src/design/index.ts';

export type Role = 'READER' | 'DESIGNER' | 'INSTRUMENT' | 'ADMIN';
export type ActorKind = 'PERSON' | 'INSTRUMENT' | 'SYSTEM';
export type RequestState = 'QUEUED' | 'RUNNING' | 'DONE' | 'FAILED' | 'CANCELLED';

export interface ActorRecord {
  readonly id: string;
  readonly kind: ActorKind;
  readonly name: string;
  readonly createdAt: Date;
}

export interface TokenRecord {
  readonly id: string;
  readonly actor: ActorRecord;
  readonly lookup: string;
  readonly secretHash: Buffer;
  readonly role: Role;
  readonly label: string;
  readonly createdAt: Date;
  readonly createdBy: string | null;
  readonly expiresAt: Date | null;
  readonly revokedAt: Date | null;
  readonly lastUsedAt: Date | null;
}

/** Who acts: the actor, and the token used, for the history. */
export interface Acting {
  readonly actorId: string;
  readonly tokenId: string | null;
}

export interface ChipRecord {
  readonly id: string;
  readonly serial: string;
  readonly description: string;
  readonly headRevision: number;
  readonly retiredAt: Date | null;
  readonly createdAt: Date;
  readonly createdBy: string;
}

export interface ChipRevisionRecord {
  readonly id: string;
  readonly chipId: string;
  readonly number: number;
  readonly hash: string;
  /** The model as it was given. */
  readonly model: ChipModelInput;
  readonly note: string;
  readonly createdAt: Date;
  readonly createdBy: string;
}

export interface DesignRecord {
  /** SHA-256 of `canonical`, hex. */
  readonly id: string;
  readonly canonical: string;
  readonly chipId: string;
  readonly chipRevisionId: string;
  readonly engine: string;
  readonly family: string | null;
  readonly architecture: string;
  readonly filterOrder: number;
  readonly met: boolean;
  readonly worstMarginDb: number | null;
  readonly insertionLossDb: number | null;
  readonly rejectionDb: number | null;
  readonly result: Design;
  readonly resultHash: string;
  readonly createdAt: Date;
}

export interface RequestRecord {
  readonly id: string;
  readonly kind: 'DESIGN';
  readonly chipId: string;
  readonly chipRevisionId: string;
  /** The request body as it was given. */
  readonly asked: unknown;
  /** Address of the question: the id its design or refusal has or will have. */
  readonly key: string;
  readonly computationId: string | null;
  readonly designId: string | null;
  readonly state: RequestState;
  /** Of its computation; 1 when DONE. */
  readonly progress: number;
  readonly problem: Problem | null;
  readonly createdAt: Date;
  readonly createdBy: string;
  readonly finishedAt: Date | null;
}

export interface ComputationRecord {
  readonly id: string;
  readonly key: string;
  readonly canonical: string;
  readonly engine: string;
  readonly attempt: number;
}

export interface ConfigurationRecord {
  readonly id: string;
  readonly chipId: string;
  readonly name: string;
  readonly lastVersion: number;
  readonly retiredAt: Date | null;
  readonly createdAt: Date;
  readonly createdBy: string;
}

export interface VersionRecord {
  readonly id: string;
  readonly configurationId: string;
  readonly configurationName: string;
  readonly chipId: string;
  readonly number: number;
  readonly chipRevisionId: string;
  readonly chipRevisionNumber: number;
  /** Of the chip now: `stale` is chipRevisionNumber < headRevision. */
  readonly headRevision: number;
  readonly sourceKind: 'DESIGN';
  readonly designId: string;
  readonly setting: Setting;
  /** SHA-256 of the canonical setting with its chip revision, hex. */
  readonly contentHash: string;
  readonly note: string;
  readonly createdAt: Date;
  readonly createdBy: string;
}

export interface ReleaseRecord {
  readonly chipId: string;
  readonly chipSerial: string;
  readonly name: string;
  readonly sequence: number;
  /** Whether the release name points here now. */
  readonly current: boolean;
  readonly version: VersionRecord;
  readonly note: string;
  readonly accepted: readonly string[];
  readonly createdAt: Date;
  readonly createdBy: string;
}

export interface HistoryRecord {
  readonly id: string;
  readonly at: Date;
  readonly actor: ActorRecord;
  readonly tokenId: string | null;
  readonly action: string;
  readonly subjectKind: string;
  readonly subjectId: string;
  readonly chipId: string | null;
  readonly detail: Readonly<Record<string, unknown>>;
}

/** A keyset page: `after` holds the sort key of the last row seen. */
export interface PageAsk {
  readonly first: number;
  readonly after?: readonly (string | number | null)[];
}

export interface Page<T> {
  readonly rows: readonly { readonly row: T; readonly sortKey: readonly (string | number | null)[] }[];
  readonly hasNextPage: boolean;
}

/** Present when the caller sent an idempotency key. */
export interface Idempotency {
  readonly key: string;
  readonly operation: string;
  readonly fingerprint: string;
}
