/** Before any test file: one PostgreSQL (that of DATABASE_URL_TEST, else an embedded one in a temporary folder) with a migrated template. */
import { randomUUID } from 'node:crypto';
import { chmod, mkdtemp, rm } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import type { TestProject } from 'vitest/node';
import { startEmbedded } from '../../server/embedded/index.ts';
import { migrate } from '../../server/store/migrate.ts';
import { execute, urlOfDatabase } from './postgres.ts';

const quiet = { info: () => {}, warn: () => {} };

async function startServer(): Promise<{ url: string; stop(): Promise<void> }> {
  const given = process.env.DATABASE_URL_TEST;
  if (given) return { url: given, stop: async () => {} };
  const folder = await mkdtemp(join(tmpdir(), 'ringbinder-test-'));
  // As root the server runs as another user, who must be able to pass.
  await chmod(folder, 0o755);
  const server = await startEmbedded({ folder: join(folder, 'postgres'), logger: quiet, durable: false });
  return {
    url: server.url,
    stop: async () => {
      await server.stop();
      await rm(folder, { recursive: true, force: true });
    },
  };
}

export default async function setup(project: TestProject): Promise<() => Promise<void>> {
  const server = await startServer();
  const template = `template_${randomUUID().replaceAll('-', '')}`;
  await execute(server.url, `create database ${template}`);
  await migrate(urlOfDatabase(server.url, template));
  project.provide('postgresUrl', server.url);
  project.provide('templateDatabase', template);
  return async () => {
    await execute(server.url, `drop database if exists ${template} with (force)`);
    await server.stop();
  };
}
