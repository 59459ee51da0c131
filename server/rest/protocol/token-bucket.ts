/** Token buckets, one a key: a steady rate with a burst, per process. */

export interface TokenBuckets {
  /** Takes one; 0 when granted, else the whole seconds until one is there again. */
  take(key: string): number;
  readonly size: number;
}

export interface BucketLimits {
  readonly perSecond: number;
  readonly burst: number;
}

interface Bucket {
  level: number;
  atMs: number;
}

/** Buckets kept before full ones are dropped: keys are tokens and addresses, and addresses are not ours to bound. */
const KEPT_BUCKETS = 10_000;

/** `nowMs` must not run backwards. */
export function createTokenBuckets(limits: BucketLimits, nowMs: () => number): TokenBuckets {
  const buckets = new Map<string, Bucket>();

  const dropFull = (now: number): void => {
    const refillMs = (limits.burst / limits.perSecond) * 1000;
    for (const [key, bucket] of buckets) if (now - bucket.atMs >= refillMs) buckets.delete(key);
    // Still too many: the oldest go. Whoever owned one starts again with a full burst, which only errs in their favour.
    for (const key of buckets.keys()) {
      if (buckets.size <= KEPT_BUCKETS / 2) break;
      buckets.delete(key);
    }
  };

  return {
    take(key) {
      const now = nowMs();
      let bucket = buckets.get(key);
      if (!bucket) {
        if (buckets.size >= KEPT_BUCKETS) dropFull(now);
        bucket = { level: limits.burst, atMs: now };
        buckets.set(key, bucket);
      }
      bucket.level = Math.min(limits.burst, bucket.level + ((now - bucket.atMs) / 1000) * limits.perSecond);
      bucket.atMs = now;
      if (bucket.level >= 1) {
        bucket.level -= 1;
        return 0;
      }
      return Math.ceil((1 - bucket.level) / limits.perSecond);
    },
    get size() {
      return buckets.size;
    },
  };
}
