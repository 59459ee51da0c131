/**
 * Accepts what was added to the GraphQL schema: writes it, as it is served, over `schema/published.graphql`.
 *
 *     npx tsx scripts/publish-schema.ts
 *
 * Refuses what would break a client. Should that be meant, change the published file by hand and say so in the changelog.
 */
import { readFileSync, writeFileSync } from 'node:fs';
import { buildSchema, findBreakingChanges } from 'graphql';
import { publishedFile, servedSdl } from '../server/graphql/sdl.ts';

const served = servedSdl();
const file = publishedFile();
const breaking = findBreakingChanges(buildSchema(readFileSync(file, 'utf8')), buildSchema(served));
for (const { description } of breaking) process.stderr.write(`Breaks clients: ${description}\n`);
if (breaking.length > 0) process.exit(1);
writeFileSync(file, served);
process.stdout.write(`${file} is what is served.\n`);
