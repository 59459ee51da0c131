/**
 * `npm run demo`: the service with an invented lab on a database of its own that ends with it, the whole job once
 * through over HTTP, and then the service to look around in.
 */
import { mkdir, mkdtemp } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { generateToken } from '../auth/index.ts';
import { runProcess } from '../run.ts';
import { createClient } from './client.ts';
import { runTour } from './tour.ts';

const say = (text: string): void => {
  process.stdout.write(`${text}\n`);
};

const folder = await mkdtemp(join(tmpdir(), 'ringbinder-demo-'));
const dataFolder = join(folder, 'database');
const plots = join(folder, 'plots');
await mkdir(plots);
const adminToken = process.env.RINGBINDER_ADMIN_TOKEN ?? generateToken().token;

await runProcess(
  { api: true, worker: true, embedded: true },
  {
    adjust: ({ databaseUrl: _notTheLabs, ...config }) => ({
      ...config,
      dataFolder,
      adminToken,
      openIntrospection: true,
      logLevel: process.env.LOG_LEVEL === undefined ? 'warn' : config.logLevel,
    }),
    async afterStart({ url }) {
      if (url === null) throw new Error('the demo needs the API');
      await runTour(createClient(url, adminToken), plots, say);
      say(`\nThe service goes on until Ctrl-C; its data (${folder}) is for looking around only.`);
      say(`Token for this demo: ${adminToken}`);
    },
  },
);
