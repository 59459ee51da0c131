/** A script's view of the service: JSON over HTTP with a bearer token, problems as errors with their own words. */

interface Answer {
  readonly status: number;
  readonly headers: Headers;
  readonly body: unknown;
}

interface Ask {
  readonly method?: string;
  readonly body?: unknown;
  readonly headers?: Readonly<Record<string, string>>;
}

export interface Client {
  readonly base: string;
  ask(path: string, ask?: Ask): Promise<Answer>;
}

interface ProblemLike {
  readonly title?: string;
  readonly detail?: string;
}

export function createClient(base: string, token: string): Client {
  return {
    base,
    async ask(path, { method = 'GET', body, headers = {} } = {}) {
      const response = await fetch(base + path, {
        method,
        headers: {
          authorization: `Bearer ${token}`,
          ...(body === undefined ? {} : { 'content-type': 'application/json' }),
          ...headers,
        },
        ...(body === undefined ? {} : { body: JSON.stringify(body) }),
      });
      const text = await response.text();
      const isJson = /json/.test(response.headers.get('content-type') ?? '');
      const parsed: unknown = isJson && text !== '' ? JSON.parse(text) : text;
      if (response.status >= 400) {
        const { title, detail } = parsed as ProblemLike;
        throw new Error(`${method} ${path}: ${response.status} ${title ?? ''} – ${detail ?? text}`);
      }
      return { status: response.status, headers: response.headers, body: parsed };
    },
  };
}
