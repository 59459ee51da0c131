/**
 * `/graphiql`: a page to try queries on. Everything it loads is served from here, out of the installed packages: labs
 * often have no internet. The token stays in the page (memory, and the tab's session storage).
 */
import { readFileSync } from 'node:fs';
import { createRequire } from 'node:module';
import { dirname, join } from 'node:path';
import type { FastifyInstance } from 'fastify';
import { findAbove } from './sdl.ts';

const PATH = '/graphiql';

/** Scripts and styles of our own origin only; the editor sets styles by itself. `ws:` for browsers whose 'self' is HTTP. */
const POLICY = [
  "default-src 'none'",
  "script-src 'self'",
  "style-src 'self' 'unsafe-inline'",
  "img-src 'self' data:",
  "font-src 'self' data:",
  "connect-src 'self' ws: wss:",
  "base-uri 'none'",
  "form-action 'none'",
  "frame-ancestors 'none'",
].join('; ');

const HTML = 'text/html; charset=utf-8';
const SCRIPT = 'text/javascript; charset=utf-8';
const STYLE = 'text/css; charset=utf-8';

/** They change with the program only. */
const CACHE = 'public, max-age=3600';

const require = createRequire(import.meta.url);

/** A file of an installed package. Its main file is found first: not every package lets its folder be named. */
function packageFile(name: string, ...path: readonly string[]): string {
  let folder = dirname(require.resolve(name));
  while (!folder.endsWith(join('node_modules', name))) folder = dirname(folder);
  return join(folder, ...path);
}

const ownFile = (name: string): string => findAbove('server', 'graphql', 'graphiql', name);

interface Asset {
  readonly type: string;
  readonly file: string;
}

function assets(): Readonly<Record<string, Asset>> {
  return {
    '': { type: HTML, file: ownFile('page.html') },
    '/page.js': { type: SCRIPT, file: ownFile('page.js') },
    '/page.css': { type: STYLE, file: ownFile('page.css') },
    '/react.js': { type: SCRIPT, file: packageFile('react', 'umd', 'react.production.min.js') },
    '/react-dom.js': { type: SCRIPT, file: packageFile('react-dom', 'umd', 'react-dom.production.min.js') },
    '/graphiql.js': { type: SCRIPT, file: packageFile('graphiql', 'graphiql.min.js') },
    '/graphiql.css': { type: STYLE, file: packageFile('graphiql', 'graphiql.min.css') },
    '/graphql-ws.js': { type: SCRIPT, file: packageFile('graphql-ws', 'umd', 'graphql-ws.min.js') },
  };
}

export function registerGraphiql(scope: FastifyInstance): void {
  for (const [path, { type, file }] of Object.entries(assets())) {
    const bytes = readFileSync(file);
    scope.get(`${PATH}${path}`, {
      config: { access: 'PUBLIC' },
      schema: { hide: true },
      handler: async (_request, reply) =>
        reply
          .headers({ 'content-type': type, 'cache-control': CACHE, 'content-security-policy': POLICY })
          .send(bytes),
    });
  }
}
