/** One line of the benchmark: ours against one peer, both measured in this run. */
export interface BenchRow {
  readonly name: string;
  readonly ours: number;
  readonly peer: number;
  readonly peerName: string;
  readonly unit: string;
  /** peer / ours for times: above 1, ours is the faster. */
  readonly ratio: number;
  readonly note: string;
}
