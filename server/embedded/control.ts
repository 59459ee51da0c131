/**
 * Starts the server by pg_ctl, for systems without a shell: pg_ctl also sheds an administrator's rights on Windows,
 * under which the server refuses to run. The server is detached; one that a killed owner left is adopted by the next.
 */
import { spawn } from 'node:child_process';
import { join } from 'node:path';
import type { Launch, Launched } from './types.ts';

const WAIT_S = '120';

function control(launch: Launch, args: readonly string[]): Promise<{ ok: boolean; log: string }> {
  return new Promise((done) => {
    const child = spawn(launch.binaries.pgCtl, ['-D', launch.folder, '-w', '-t', WAIT_S, ...args], {
      ...launch.owner,
      cwd: launch.folder,
      windowsHide: true,
      // Not a pipe: the detached server inherits it and would keep it open for ever.
      stdio: 'ignore',
    });
    child.once('error', (error) => done({ ok: false, log: String(error) }));
    child.once('exit', (code) => done({ ok: code === 0, log: `pg_ctl ended with ${code}` }));
  });
}

export async function launchControlled(launch: Launch): Promise<Launched> {
  const options = [`-p ${launch.port}`, ...launch.settings.map((setting) => `-c ${setting}`)].join(' ');
  const log = join(launch.folder, 'server.log');
  const started = await control(launch, ['start', '-l', log, '-o', options]);
  if (!started.ok) return { started: false, log: `${started.log}; see ${log}` };
  return {
    started: true,
    stop: async () => {
      await control(launch, ['stop', '-m', 'fast']);
    },
  };
}
