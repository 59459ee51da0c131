import { spawn } from 'node:child_process';
import { randomBytes } from 'node:crypto';
import {
  chownSync,
  existsSync,
  mkdtempSync,
  readdirSync,
  readFileSync,
  renameSync,
  rmSync,
  statSync,
  writeFileSync,
} from 'node:fs';
import { join } from 'node:path';
import type { Binaries, Owner } from './types.ts';

/** Readable by the server's user and by root alone. Any local user can reach the TCP port, so the port asks for it. */
const PASSWORD_FILE = 'ringbinder.password';
const MAKING = 'making-';
/** Making a cluster takes seconds; what is older was left by a killed process. */
const ABANDONED_MS = 10 * 60_000;

function run(command: string, args: readonly string[], owner: Owner, cwd: string): Promise<void> {
  return new Promise((done, fail) => {
    const child = spawn(command, args, {
      ...owner,
      cwd,
      windowsHide: true,
      stdio: ['ignore', 'ignore', 'pipe'],
    });
    let errors = '';
    child.stderr.on('data', (chunk: Buffer) => {
      errors = (errors + chunk).slice(-4000);
    });
    child.on('error', fail).on('close', (code) => {
      if (code === 0) done();
      else fail(new Error(`${command} ended with ${code}: ${errors}`));
    });
  });
}

function giveTo(owner: Owner, path: string): void {
  if (owner.uid !== undefined && owner.gid !== undefined) chownSync(path, owner.uid, owner.gid);
}

function clearAbandoned(folder: string): void {
  for (const name of readdirSync(folder)) {
    const path = join(folder, name);
    if (!name.startsWith(MAKING) || Date.now() - statSync(path).mtimeMs < ABANDONED_MS) continue;
    rmSync(path, { recursive: true, force: true });
  }
}

/** Makes the cluster aside and renames it into place whole: a kill in between leaves nothing half-made, and of two first starts one wins. */
export async function initialise(
  binaries: Binaries,
  folder: string,
  owner: Owner,
  durable: boolean,
): Promise<void> {
  const cluster = clusterOf(folder);
  if (existsSync(join(cluster, 'PG_VERSION'))) return;
  clearAbandoned(folder);
  const aside = mkdtempSync(join(folder, MAKING));
  try {
    giveTo(owner, aside);
    const password = randomBytes(24).toString('base64url');
    const made = join(aside, 'cluster');
    const secret = join(aside, PASSWORD_FILE);
    writeFileSync(secret, password, { mode: 0o600 });
    giveTo(owner, secret);
    const access = ['-U', 'postgres', '--auth=scram-sha-256', `--pwfile=${secret}`];
    const locale = [
      '--encoding=UTF8',
      '--no-locale',
      '--locale-provider=builtin',
      '--builtin-locale=C.UTF-8',
    ];
    await run(
      binaries.initdb,
      ['-D', made, ...access, ...locale, ...(durable ? [] : ['--no-sync'])],
      owner,
      aside,
    );
    renameSync(secret, join(made, PASSWORD_FILE));
    try {
      renameSync(made, cluster);
    } catch (error) {
      if (!existsSync(join(cluster, 'PG_VERSION'))) throw error;
    }
  } finally {
    rmSync(aside, { recursive: true, force: true });
  }
}

export function clusterOf(folder: string): string {
  return join(folder, 'cluster');
}

export function readPassword(folder: string): string {
  return readFileSync(join(clusterOf(folder), PASSWORD_FILE), 'utf8').trim();
}
