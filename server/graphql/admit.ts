/** Who asks, as the application's access rules find out. */
import type { Viewer } from '../auth/index.ts';

/** What of a request tells who asks; a message of a socket has the same. */
export interface Caller {
  readonly ip: string;
  readonly headers: { readonly authorization?: string | undefined };
}

/** Believes the token and counts the call against its rate. Throws UNAUTHENTICATED, RATE_LIMITED. */
export type Admit = (caller: Caller) => Promise<Viewer>;
