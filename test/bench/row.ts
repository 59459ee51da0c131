/** One line of the benchmark: ours against one peer, both measured in this run. */
export interface BenchRow {
  readonly name: string;
  readonly ours: number;
  readonly peer: number;
  readonly peerName: string;
  readonly unit: string;
  /** Above 1, ours is the faster: peer / ours for times, ours / peer for rates. */
  readonly ratio: number;
  readonly note: string;
}

/** Rows of one topic, and what could not be measured here. */
export interface Topic {
  readonly title: string;
  readonly rows: readonly BenchRow[];
  /** Sentences: which peers are missing on this machine. */
  readonly missing: readonly string[];
}

/** How long to measure. `quick` proves that everything runs; its figures are coarse. */
export interface Effort {
  readonly quick: boolean;
}
