/**
 * What the core refuses, and why: a refusal is data a person can act on. Pointers are RFC 6901 into the *canonical*
 * request `{specification, synthesis}` (offsets in GHz); `schema/` translates them into the asker's own units.
 */
export type RefusalCode =
  | 'SPECIFICATION_INVALID'
  | 'BANDS_COLLIDE'
  | 'SPECIFICATION_UNREACHABLE'
  | 'SETTING_UNREACHABLE';

export type LimitKind =
  | 'PASSIVITY'
  | 'ORDER'
  | 'RINGS'
  | 'COUPLING_RANGE'
  | 'FREE_SPECTRAL_RANGE'
  | 'CHANNEL_CURRENT'
  | 'CHANNEL_POWER'
  | 'TOTAL_POWER'
  | 'REJECTION_FLOOR';

/** One change of the canonical request that would help. `works: null` removes the member. */
export interface Change {
  readonly pointer: string;
  readonly given: unknown;
  readonly works: unknown;
  readonly unit?: string;
}

/** A set of changes that together turn the request into one that works. */
export interface Suggestion {
  readonly reason: string;
  readonly changes: readonly Change[];
}

export interface RefusalDetails {
  readonly code: RefusalCode;
  /** One or two plain sentences: what was asked, what is possible. */
  readonly detail: string;
  readonly pointer?: string;
  readonly given?: unknown;
  readonly allowed?: unknown;
  readonly limit?: LimitKind;
  /** The chip element or driver channel that stands in the way. */
  readonly element?: string;
  readonly channel?: string;
  readonly nearest?: readonly Suggestion[];
}

/** The request is understood and cannot be met. Deterministic: never retried, kept as an answer. */
export class Refusal extends Error {
  override readonly name = 'Refusal';
  constructor(readonly details: RefusalDetails) {
    super(details.detail);
  }
}

/** An iteration reached its named cap. Carries the residual instead of returning rubbish. A defect or a hard problem, not a refusal. */
export class NoConvergence extends Error {
  override readonly name = 'NoConvergence';
  constructor(
    readonly what: string,
    readonly iterations: number,
    readonly residual: number,
  ) {
    super(`${what} did not converge in ${iterations} iterations (residual ${residual.toExponential(2)})`);
  }
}
