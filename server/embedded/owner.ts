/** PostgreSQL refuses to run as root: then it runs as another user, made if the system has none. */
import { spawnSync } from 'node:child_process';
import { readFileSync } from 'node:fs';
import type { Owner } from './types.ts';

const USERS = ['postgres', 'ringbinder'];

/** Debian and most others, then Alpine. */
const CREATE_USER: readonly (readonly [string, ...string[]])[] = [
  ['useradd', '--system', '--no-create-home', '--shell', '/bin/sh', 'ringbinder'],
  ['adduser', '-S', '-D', '-H', 'ringbinder'],
];

function lookUp(): Owner | null {
  const entries = readFileSync('/etc/passwd', 'utf8')
    .split('\n')
    .map((line) => line.split(':'));
  for (const user of USERS) {
    const entry = entries.find((fields) => fields[0] === user);
    if (entry) return { uid: Number(entry[2]), gid: Number(entry[3]) };
  }
  return null;
}

/** @throws Error when we are root and neither find nor can make another user. */
export function findOwner(): Owner {
  if (process.getuid?.() !== 0) return {};
  const present = lookUp();
  if (present) return present;
  for (const [command, ...args] of CREATE_USER) {
    if (spawnSync(command, args, { stdio: 'ignore' }).status !== 0) continue;
    const made = lookUp();
    if (made) return made;
  }
  throw new Error(
    'PostgreSQL does not run as root, and no system user "ringbinder" could be made. Start the service as an ordinary user, or set DATABASE_URL.',
  );
}

/** Whether that user can enter `folder` and, if given, run `file` in it: asked of the system, not computed from modes. */
export function canReach(owner: Owner, folder: string, file?: string): boolean {
  if (owner.uid === undefined) return true;
  const script = file === undefined ? 'cd "$1"' : 'cd "$1" && test -r "$2" && test -x "$2"';
  const asked = spawnSync('/bin/sh', ['-c', script, 'sh', folder, file ?? ''], {
    uid: owner.uid,
    ...(owner.gid === undefined ? {} : { gid: owner.gid }),
    cwd: '/',
    stdio: 'ignore',
  });
  return asked.status === 0;
}
