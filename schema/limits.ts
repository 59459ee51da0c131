/**
 * Every limit of the service in one place. `service.limits` tells them to clients, the doors enforce them, the zod
 * rules beside this file use them. Raising one is compatible; lowering one is not.
 */
export const LIMITS = {
  /** Bytes of a request body. A chip of 256 channels with a full crosstalk matrix takes about 0.7 MB. */
  bodyBytes: 1_048_576,
  /** Bytes of a GraphQL document. */
  documentBytes: 32_768,
  /** Nesting of a GraphQL operation; `__schema` is exempt because the standard introspection query is 15 deep. */
  queryDepth: 12,
  /** Aliases and root fields of a GraphQL operation, together. */
  aliases: 30,
  /** Cost of a GraphQL operation: 1 a field × list size, a curve 20 + points/100, figures 20. */
  queryCost: 5_000,
  /** Points of all curves of one GraphQL operation together. */
  operationPoints: 100_000,
  /** Points of one curve: ±10,000 and the middle. */
  gridPoints: 20_001,
  /** Bands of a mask. */
  bands: 64,
  /** Filter order; the core is checked to it against published designs. */
  order: 16,
  /** Entries of a list page. */
  pageSize: 200,
  defaultPageSize: 50,
  /** Cells of a chip. */
  cells: 32,
  /** Rings of one arm. */
  ringsPerArm: 16,
  /** Driver channels of a chip. */
  channels: 256,
  /** Requests of one token that are queued or running. */
  openRequests: 200,
  /** Requests that are queued or running altogether, before more are turned away. */
  queuedRequests: 10_000,
  /** Open subscriptions of one token. */
  subscriptions: 20,
  /** Open long polls of one token. */
  longPolls: 20,
  /** Requests a second of one token, per process. */
  requestsPerSecond: 50,
  /** Requests at once of one token, per process. */
  requestBurst: 100,
  /** Seconds a `Prefer: wait=N` is honoured for at most. */
  waitSeconds: 60,
  /** Characters of a note. */
  noteCharacters: 2_000,
  /** Characters of a chip's description. */
  descriptionCharacters: 2_000,
  /** Characters of a band's or token's label. */
  labelCharacters: 100,
  /** Caution codes accepted in one publication. */
  acceptedCautions: 32,
} as const;

export type Limits = { readonly [K in keyof typeof LIMITS]: number };
