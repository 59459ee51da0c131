/** What is told of many measurements. */

const ascending = (values: readonly number[]): number[] => [...values].sort((a, b) => a - b);

/** The value that `share` of all do not exceed (nearest rank). */
export function quantile(values: readonly number[], share: number): number {
  const sorted = ascending(values);
  if (sorted.length === 0) throw new RangeError('no measurements');
  return sorted[Math.min(sorted.length - 1, Math.max(0, Math.ceil(share * sorted.length) - 1))]!;
}

export const median = (values: readonly number[]): number => quantile(values, 0.5);
export const least = (values: readonly number[]): number => quantile(values, 0);
