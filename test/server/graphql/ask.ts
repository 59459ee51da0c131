/** How tests talk to GraphQL: over real HTTP and real sockets, with clients that are not ours. */
import { type Client, createClient } from 'graphql-ws';
import WebSocket from 'ws';
import type { Problem } from '../../../schema/problem.ts';
import type { Service } from '../rest/service.ts';

export interface Asked {
  readonly status: number;
  readonly headers: Headers;
  // biome-ignore lint/suspicious/noExplicitAny: answers are checked member by member by the tests
  readonly data: any;
  readonly errors: readonly {
    readonly message: string;
    readonly path?: readonly (string | number)[];
    readonly extensions: Problem;
  }[];
}

export interface AskOptions {
  readonly variables?: Readonly<Record<string, unknown>>;
  readonly operationName?: string;
  /** null: none. DESIGNER when absent. */
  readonly token?: string | null;
}

export async function ask(service: Service, query: string, options: AskOptions = {}): Promise<Asked> {
  const { variables, operationName, token } = options;
  const answer = await service.call('/graphql', {
    method: 'POST',
    body: { query, ...(variables ? { variables } : {}), ...(operationName ? { operationName } : {}) },
    ...(token === undefined ? {} : { token }),
  });
  const { data = null, errors = [] } = answer.json;
  return { status: answer.status, headers: answer.headers, data, errors };
}

/** Twice: the second time the document is compiled. The answers must not differ. */
export async function askTwice(
  service: Service,
  query: string,
  options: AskOptions = {},
): Promise<[Asked, Asked]> {
  const first = await ask(service, query, options);
  return [first, await ask(service, query, options)];
}

/** The data, or what went wrong as the test's failure. */
export async function read(service: Service, query: string, options: AskOptions = {}) {
  const { data, errors } = await ask(service, query, options);
  if (errors.length > 0) throw new Error(JSON.stringify(errors));
  return data;
}

export interface Line {
  readonly client: Client;
  /** Code and reason with which the socket ended. */
  readonly closed: Promise<{ readonly code: number; readonly reason: string }>;
  /** Everything a subscription sends, one at a time; ends with it. */
  follow(
    query: string,
    variables?: Record<string, unknown>,
    // biome-ignore lint/suspicious/noExplicitAny: answers are checked member by member by the tests
  ): AsyncIterableIterator<any>;
}

export interface LineOptions {
  readonly token?: string;
  /** Where the token goes: the first message, or a header of the upgrade. */
  readonly by?: 'MESSAGE' | 'HEADER';
}

/** A client of another making (graphql-ws over ws), with one socket. */
export function openLine(url: string, { token, by = 'MESSAGE' }: LineOptions): Line {
  const authorization = token === undefined ? {} : { authorization: `Bearer ${token}` };
  class Socket extends WebSocket {
    constructor(address: string, protocols: string | string[]) {
      super(address, protocols, by === 'HEADER' ? { headers: authorization } : {});
    }
  }
  let tell: (end: { code: number; reason: string }) => void;
  const closed = new Promise<{ code: number; reason: string }>((resolve) => {
    tell = resolve;
  });
  const client = createClient({
    url: `${url.replace('http', 'ws')}/graphql`,
    webSocketImpl: Socket,
    retryAttempts: 0,
    ...(by === 'MESSAGE' ? { connectionParams: authorization } : {}),
    on: { closed: (event) => tell(event as { code: number; reason: string }) },
  });
  return {
    client,
    closed,
    follow: (query, variables = {}) => client.iterate({ query, variables }),
  };
}
