import { defineConfig } from 'prisma/config';

// `generate` insists on a schema engine it never runs; any executable stands in, and nothing is downloaded.
if (process.argv.includes('generate')) process.env.PRISMA_SCHEMA_ENGINE_BINARY ??= process.execPath;

export default defineConfig({ schema: 'prisma/schema.prisma', migrations: { path: 'prisma/migrations' } });
