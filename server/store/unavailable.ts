/** The database is away, full or too slow. Nothing was written, or (a connection lost in COMMIT) the caller cannot know: idempotency keys are for that. */
export class StoreUnavailable extends Error {
  override readonly name = 'StoreUnavailable';
}

/** SQLSTATE classes 08 (connection), 53 (resources), 57P0x (shutdown, crash, not yet up) and the cancel by statement_timeout. */
const CODES = /^(08...|53...|57P0[1-5]|57014|25P0[34])$/;
/** Of Node's sockets and of Prisma (cannot reach, timed out, closed, pool timeout). */
const NAMES = new Set(
  'ECONNREFUSED ECONNRESET EPIPE ETIMEDOUT EHOSTUNREACH ENETUNREACH ENOTFOUND EAI_AGAIN P1001 P1002 P1008 P1017 P2024'.split(
    ' ',
  ),
);
/** pg reports these without any code. */
const WORDS =
  /connection terminated|terminated unexpectedly|timeout exceeded when trying to connect|^timeout expired$|client has encountered a connection error|query read timeout|not queryable|can't reach database|server has closed the connection|cannot use a pool after calling end/i;

function signs(error: object): string[] {
  return ['code', 'originalCode', 'kind'].flatMap((name) => {
    const value: unknown = Reflect.get(error, name);
    return typeof value === 'string' ? [value] : [];
  });
}

/** Looks through causes too: Prisma wraps what the driver threw, sockets report several tries as one AggregateError. */
export function isUnavailable(error: unknown, depth = 0): boolean {
  if (typeof error !== 'object' || error === null || depth > 4) return false;
  if (signs(error).some((sign) => CODES.test(sign) || NAMES.has(sign))) return true;
  if (error instanceof Error && WORDS.test(error.message)) return true;
  const inner: unknown[] = [Reflect.get(error, 'cause'), Reflect.get(error, 'meta')];
  const several: unknown = Reflect.get(error, 'errors');
  if (Array.isArray(several)) inner.push(...several);
  const adapter: unknown = Reflect.get(error, 'driverAdapterError');
  return [...inner, adapter].some((one) => isUnavailable(one, depth + 1));
}

/** Makes every asynchronous operation of an object throw StoreUnavailable where the database is the reason. */
export function guarded<T extends object>(operations: T): T {
  const guard =
    (operation: (...args: unknown[]) => Promise<unknown>) =>
    async (...args: unknown[]): Promise<unknown> => {
      try {
        return await operation(...args);
      } catch (error) {
        if (!isUnavailable(error)) throw error;
        throw new StoreUnavailable('the database cannot be reached', { cause: error });
      }
    };
  return Object.fromEntries(
    Object.entries(operations).map(([name, operation]) => [name, guard(operation)]),
  ) as T;
}
