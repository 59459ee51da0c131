/**
 * Look-ups of one operation, gathered: fields of the same level ask for one record each, the store is asked once for all.
 * Answers are kept for the operation, so that it sees one state of every record.
 */

/** Answers in any order; what is not in the map is null. */
export type LoadMany<T> = (keys: readonly string[]) => Promise<ReadonlyMap<string, T>>;

export type Load<T> = (key: string) => Promise<T | null>;

interface Waiting<T> {
  readonly key: string;
  resolve(value: T | null): void;
  reject(error: unknown): void;
}

export function createLoad<T>(loadMany: LoadMany<T>): Load<T> {
  const known = new Map<string, Promise<T | null>>();
  let gathered: Waiting<T>[] = [];

  const dispatch = (): void => {
    const asked = gathered;
    gathered = [];
    loadMany(asked.map(({ key }) => key)).then(
      (found) => {
        for (const { key, resolve } of asked) resolve(found.get(key) ?? null);
      },
      (error: unknown) => {
        for (const { reject } of asked) reject(error);
      },
    );
  };

  return (key) => {
    const before = known.get(key);
    if (before !== undefined) return before;
    const promise = new Promise<T | null>((resolve, reject) => {
      // After all promises that are settled by now have told their resolvers: a whole level of the answer has asked.
      if (gathered.length === 0) setImmediate(dispatch);
      gathered.push({ key, resolve, reject });
    });
    known.set(key, promise);
    return promise;
  };
}
