/** Pages for people: what each kind of problem means, and the OpenAPI document with its reader. No outside assets. */
import swagger from '@fastify/swagger';
import swaggerUi from '@fastify/swagger-ui';
import type { FastifyInstance } from 'fastify';
import { createJsonSchemaTransform, createJsonSchemaTransformObject } from 'fastify-type-provider-zod';
import { z } from 'zod';
import { notFound, problemPage, problemSlugs } from '../errors.ts';
import { describe, documentedRules } from './describe.ts';
import { paramOf } from './parameters.ts';
import { negotiate } from './protocol/index.ts';
import { JSON_TYPE } from './reply.ts';

/** Answers that do not depend on who asks may be kept for a while, s. */
const PUBLIC_CACHE = 'public, max-age=300';

const PAGE_POLICY =
  "default-src 'none'; style-src 'unsafe-inline'; frame-ancestors 'none'; base-uri 'none'; form-action 'none'";

/**
 * The reader's own scripts and this service, nobody else; it sets styles by itself. Not `upgrade-insecure-requests`, which
 * the package would add: a lab without TLS would then see an empty page.
 */
const READER_POLICY = [
  "default-src 'none'",
  "script-src 'self'",
  "style-src 'self' 'unsafe-inline'",
  "img-src 'self' data:",
  "font-src 'self' data:",
  "connect-src 'self'",
  "base-uri 'none'",
  "form-action 'none'",
  "frame-ancestors 'none'",
].join('; ');

/** A ring beside its bus waveguide. */
const ICON =
  '<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 16 16" fill="none" stroke="#0b3c6f" stroke-width="2"><circle cx="8" cy="6.5" r="4.5"/><path d="M1 14h14"/></svg>';

const MARKDOWN = { suffix: 'md', mediaType: 'text/markdown' };
const HTML = { suffix: 'html', mediaType: 'text/html' };

const namedRules = createJsonSchemaTransformObject({ schemaRegistry: documentedRules });

/** Every named rule comes in a form for requests and one for answers; what nothing refers to is left out. */
function withoutUnused(document: ReturnType<typeof namedRules>): ReturnType<typeof namedRules> {
  if (!('components' in document) || !document.components?.schemas) return document;
  const { schemas, ...components } = document.components;
  const referredIn = (part: unknown): string[] =>
    [...JSON.stringify(part).matchAll(/"#\/components\/schemas\/([^"/]+)"/g)].map((found) => found[1]!);
  const used = new Set<string>();
  const waiting = referredIn({ ...document, components });
  for (let name = waiting.pop(); name !== undefined; name = waiting.pop()) {
    if (used.has(name)) continue;
    used.add(name);
    waiting.push(...referredIn(schemas[name] ?? null));
  }
  const kept = Object.fromEntries(Object.entries(schemas).filter(([name]) => used.has(name)));
  return { ...document, components: { ...components, schemas: kept } } as typeof document;
}

export function registerDocument(app: FastifyInstance, version: string): void {
  app.register(swagger, {
    openapi: {
      openapi: '3.1.0',
      info: {
        title: 'Ringbinder',
        version,
        description:
          'From a filter specification to heater currents. Errors are `application/problem+json` (RFC 9457); every record has a strong ETag; lists continue with `Link: <…>; rel="next"`. The full contract is GraphQL at `/graphql`; this part is what scripts and instrument PCs need.\n\nCautions: light in fibres and chips is often invisible and can injure; too much heater current destroys a chip. The laser safety officer, local rules and the data sheets decide what may be set.',
        license: { name: 'Apache-2.0', identifier: 'Apache-2.0' },
      },
      servers: [{ url: '/' }],
      components: {
        securitySchemes: {
          bearer: { type: 'http', scheme: 'bearer', description: '`rbt_…`, made by an administrator.' },
        },
      },
    },
    transform: createJsonSchemaTransform({ schemaRegistry: documentedRules }),
    transformObject: (document) => withoutUnused(namedRules(document)),
  });
}

export function registerPages(app: FastifyInstance): void {
  let text: string | undefined;
  app.get('/openapi.json', {
    config: { access: 'PUBLIC' },
    schema: describe({
      tag: 'Documents',
      summary: 'This document',
      isPublic: true,
      answers: {
        200: { about: 'OpenAPI 3.1.', content: { [JSON_TYPE]: z.looseObject({ openapi: z.string() }) } },
      },
    }),
    handler: async (_request, reply) => {
      text ??= JSON.stringify(app.swagger());
      return reply.headers({ 'content-type': JSON_TYPE, 'cache-control': PUBLIC_CACHE }).send(text);
    },
  });

  app.get('/problems/:type', {
    config: { access: 'PUBLIC' },
    schema: describe({
      tag: 'Documents',
      summary: 'What a kind of problem means and what to do',
      isPublic: true,
      params: z.object({ type: z.enum(problemSlugs() as [string, ...string[]]) }),
      answers: {
        200: { about: 'The page.', content: { 'text/markdown': z.string(), 'text/html': z.string() } },
      },
      problems: ['NOT_FOUND'],
    }),
    handler: async (request, reply) => {
      const slug = paramOf(request, 'type');
      const page = problemPage(slug);
      if (page === null) throw notFound(`problem type ${slug.slice(0, 64)}`);
      reply.headers({ vary: 'Accept', 'cache-control': PUBLIC_CACHE });
      const asHtml = negotiate(request.headers.accept, [MARKDOWN, HTML]) === HTML;
      if (!asHtml) return reply.header('content-type', 'text/markdown; charset=utf-8').send(page);
      return reply
        .headers({ 'content-type': 'text/html; charset=utf-8', 'content-security-policy': PAGE_POLICY })
        .send(htmlOf(page));
    },
  });

  app.register(async (scope) => {
    scope.addHook('onRoute', (route) => {
      route.config = { ...route.config, access: 'PUBLIC' };
      route.schema = { ...route.schema, hide: true };
    });
    await scope.register(swaggerUi, {
      routePrefix: '/docs',
      staticCSP: READER_POLICY,
      // No bar with an address to type: this page is for this service.
      uiConfig: {
        layout: 'BaseLayout',
        docExpansion: 'list',
        deepLinking: true,
        persistAuthorization: false,
      },
      theme: {
        title: 'Ringbinder: REST',
        favicon: [{ filename: 'icon.svg', rel: 'icon', type: 'image/svg+xml', sizes: 'any', content: ICON }],
      },
    });
  });
}

const escapeHtml = (text: string): string =>
  text.replaceAll('&', '&amp;').replaceAll('<', '&lt;').replaceAll('>', '&gt;').replaceAll('"', '&quot;');

/** Our own pages use a heading, paragraphs and code spans, and nothing else of Markdown. */
function htmlOf(markdown: string): string {
  const blocks = markdown
    .trim()
    .split(/\n{2,}/)
    .map((block) => {
      const inner = escapeHtml(block.replace(/^# /, '')).replace(/`([^`]+)`/g, '<code>$1</code>');
      return block.startsWith('# ') ? `<h1>${inner}</h1>` : `<p>${inner}</p>`;
    });
  const title = escapeHtml(/^# (.*)$/m.exec(markdown)?.[1] ?? 'Problem');
  const style =
    'body{font:1rem/1.5 system-ui,sans-serif;max-width:40rem;margin:3rem auto;padding:0 1rem;color:#222;background:#fff}';
  return `<!doctype html><html lang="en"><meta charset="utf-8"><meta name="viewport" content="width=device-width"><title>${title}</title><style>${style}</style><body><main>${blocks.join('')}</main></body></html>`;
}
