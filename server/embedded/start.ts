import { existsSync } from 'node:fs';
import { createServer } from 'node:net';
import { join } from 'node:path';
import { setTimeout as sleep } from 'node:timers/promises';
import { launchControlled } from './control.ts';
import { clusterOf, initialise, readPassword } from './initialise.ts';
import { findOwner } from './owner.ts';
import { placeBinaries, placeData } from './place.ts';
import { findRunning, urlOf } from './running.ts';
import type { Embedded, EmbeddedOptions, Launch } from './types.ts';
import { launchWrapped } from './wrapper.ts';

/** A predecessor that is shutting down, or a port lost to somebody else in between, settles within this many tries. */
const TRIES = 40;
const PAUSE_MS = 250;

function freePort(): Promise<number> {
  return new Promise((done, fail) => {
    const server = createServer().once('error', fail);
    server.listen(0, '127.0.0.1', () => {
      const address = server.address();
      server.close(() => {
        if (address !== null && typeof address === 'object') done(address.port);
        else fail(new Error('no free port'));
      });
    });
  });
}

function settingsOf(durable: boolean): string[] {
  const settings = [
    'listen_addresses=127.0.0.1',
    // No socket file: its path would limit the folder's length to about 100 characters.
    'unix_socket_directories=',
    // Containers give 64 MiB of /dev/shm; parallel workers are the ones that fill it, and our statements gain nothing by them.
    'max_parallel_workers_per_gather=0',
    'max_connections=200',
  ];
  return durable ? settings : [...settings, 'fsync=off', 'synchronous_commit=off', 'full_page_writes=off'];
}

/**
 * Starts PostgreSQL on `folder` (made when missing), or adopts the one that runs there already.
 * Cold about 1.3 s, on an existing folder 0.15 s.
 * @throws Error with the server's own words when it cannot start.
 */
export async function startEmbedded(options: EmbeddedOptions): Promise<Embedded> {
  const owner = findOwner();
  const binaries = await placeBinaries(owner);
  const folder = placeData(options.folder, owner, options.logger);
  const durable = options.durable ?? true;
  await initialise(binaries, folder, owner, durable);
  const cluster = clusterOf(folder);
  const password = readPassword(folder);
  const controlled =
    (options.launcher ?? (process.platform === 'win32' ? 'CONTROL' : 'WRAPPER')) === 'CONTROL';
  let log = '';
  for (let attempt = 0; attempt < TRIES; attempt++) {
    const running = await findRunning(cluster, password);
    if (running !== null) {
      options.logger.info({ port: running, folder }, 'adopted the PostgreSQL that runs on the data folder');
      return { url: urlOf(running, password), port: running, folder, adopted: true, stop: async () => {} };
    }
    const port = options.port ?? (await freePort());
    const launch: Launch = {
      binaries,
      folder: cluster,
      port,
      settings: settingsOf(durable),
      owner,
    };
    const launched = await (controlled ? launchControlled(launch) : launchWrapped(launch));
    if (launched.started) {
      options.logger.info({ port, folder }, 'PostgreSQL started');
      return { url: urlOf(port, password), port, folder, adopted: false, stop: launched.stop };
    }
    log = launched.log;
    // Without a predecessor of ours that is still ending, the port is somebody else's and stays so.
    const isTaken = options.port !== undefined && /address already in use/i.test(log);
    if (isTaken && !existsSync(join(cluster, 'postmaster.pid'))) break;
    await sleep(PAUSE_MS);
  }
  throw new Error(`PostgreSQL did not start in ${folder}: ${log}`);
}
