/** The schema as it is written: every `schema/*.graphql` but the record of what has been published. */
import { existsSync, readdirSync, readFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { buildSchema, lexicographicSortSchema, printSchema } from 'graphql';

/** What clients may rely on; new parts are added to it on purpose, by `scripts/publish-schema.ts`. */
const PUBLISHED_FILE = 'published.graphql';

/** The nearest folder or file of that path above this one: the compiled tree lies a level deeper than the sources. */
export function findAbove(...path: readonly string[]): string {
  for (let folder = dirname(fileURLToPath(import.meta.url)); ; folder = dirname(folder)) {
    const candidate = join(folder, ...path);
    if (existsSync(candidate)) return candidate;
    if (folder === dirname(folder)) throw new Error(`${join(...path)} was not found above the server`);
  }
}

/** All files in the order of their names, which is no order that matters. */
export function readSdl(): string {
  const folder = dirname(findAbove('schema', 'query.graphql'));
  return readdirSync(folder)
    .filter((name) => name.endsWith('.graphql') && name !== PUBLISHED_FILE)
    .sort()
    .map((name) => readFileSync(join(folder, name), 'utf8'))
    .join('\n');
}

/** Path of the record of what has been published. */
export function publishedFile(): string {
  return join(dirname(findAbove('schema', 'query.graphql')), PUBLISHED_FILE);
}

/** As a client sees it, descriptions included, in an order that does not depend on files. */
export function servedSdl(): string {
  return `${printSchema(lexicographicSortSchema(buildSchema(readSdl())))}\n`;
}
