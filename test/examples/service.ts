/** `npm start` as a person has it, on a database of the test's own: a real process, driven from outside. */
import { type ChildProcess, execFile, spawn } from 'node:child_process';
import { once } from 'node:events';
import { fileURLToPath } from 'node:url';
import { generateToken } from '../../server/auth/index.ts';
import { createTestDatabase } from '../support/postgres.ts';

/** The project's own folder, where its documents say that commands are typed. */
export const ROOT = fileURLToPath(new URL('../..', import.meta.url));

/** Starting means transpiling the whole server, on a machine that runs other tests beside. */
const START_MS = 90_000;

export interface StartedService {
  /** What the documents ask for in the environment: RINGBINDER_URL and RINGBINDER_TOKEN. */
  readonly environment: Readonly<Record<string, string>>;
  stop(): Promise<void>;
}

async function urlOf(child: ChildProcess): Promise<string> {
  let output = '';
  const address = new Promise<string>((resolve, reject) => {
    const hear = (chunk: Buffer): void => {
      output += chunk.toString();
      const found = /REST +(http:\/\/\S+)\/v1/.exec(output);
      if (found) resolve(found[1]!);
    };
    child.stdout?.on('data', hear);
    child.stderr?.on('data', hear);
    child.once('exit', () => reject(new Error(`the service ended:\n${output}`)));
    setTimeout(() => reject(new Error(`the service did not start:\n${output}`)), START_MS).unref();
  });
  return address;
}

export async function startService(): Promise<StartedService> {
  const database = await createTestDatabase();
  const { token } = generateToken();
  const child = spawn(process.execPath, ['--import', 'tsx', 'server/main.ts'], {
    cwd: ROOT,
    env: {
      ...process.env,
      ...{ DATABASE_URL: database.url, PORT: '0', RINGBINDER_ADMIN_TOKEN: token, RINGBINDER_THREADS: '1' },
    },
    stdio: ['ignore', 'pipe', 'pipe'],
  });
  const exited = once(child, 'exit');
  const stop = async (): Promise<void> => {
    child.kill('SIGTERM');
    await exited;
    await database.drop();
  };
  try {
    return { environment: { RINGBINDER_URL: await urlOf(child), RINGBINDER_TOKEN: token }, stop };
  } catch (error) {
    await stop();
    throw error;
  }
}

export interface Ran {
  readonly code: number;
  readonly output: string;
}

/** Runs a program in the project's folder; standard output and error in one text. */
export function run(
  program: string,
  args: readonly string[],
  environment: Readonly<Record<string, string>>,
): Promise<Ran> {
  return new Promise((resolve) => {
    const options = { cwd: ROOT, env: { ...process.env, ...environment }, maxBuffer: 16 * 1024 * 1024 };
    const child = execFile(program, args, options, (error, stdout, stderr) => {
      const code = error === null ? 0 : typeof error.code === 'number' ? error.code : 1;
      resolve({ code, output: `${stdout}${stderr}${error?.killed ? '\n(killed)' : ''}` });
    });
    child.stdin?.end();
  });
}

/** What every program answers with success. Not every awk has a version to tell. */
const TRIAL: Readonly<Record<string, readonly string[]>> = { awk: ['BEGIN { exit 0 }'] };

/** Which of `programs` this machine has not: Node is all that the project asks for, so their tests are skipped then. */
export async function missingAmong(programs: readonly string[]): Promise<readonly string[]> {
  const missing: string[] = [];
  for (const program of programs)
    if ((await run(program, TRIAL[program] ?? ['--version'], {})).code !== 0) missing.push(program);
  return missing;
}

/** The reason of a skip, for the title of what is skipped. */
export function notRun(missing: readonly string[]): string {
  return missing.length === 0 ? '' : ` (not run: ${missing.join(', ')} not installed)`;
}
