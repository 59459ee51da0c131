/**
 * `npm run demo`: the service with an invented lab on a database of its own that ends with it, the whole job once
 * through over HTTP, and then the service to look around in.
 */
import { rmSync } from 'node:fs';
import { chmod, mkdir, mkdtemp } from 'node:fs/promises';
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
// As root the database runs as another user, who has to get in.
await chmod(folder, 0o711);
const dataFolder = join(folder, 'database');
const plots = join(folder, 'plots');
await mkdir(plots);
// The plots stay for whoever wants them; the database is gone with the demo.
process.on('exit', () => rmSync(dataFolder, { recursive: true, force: true }));
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
      say(`\nThe service goes on until Ctrl-C; it ends with its data; the plots stay in ${plots}.`);
      say(`Token for this demo: ${adminToken}`);
    },
  },
);
