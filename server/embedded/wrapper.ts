/**
 * Starts the server under a shell that holds a pipe to us. However this process ends, kill -9 included, the pipe's
 * read end sees the end of file and the shell orders a fast, clean shutdown. The shell leads its own process group and
 * ignores the terminal's signals, so that Ctrl-C reaches us first and running statements can end.
 */
import { spawn } from 'node:child_process';
import { once } from 'node:events';
import type { Socket } from 'node:net';
import type { Launch, Launched } from './types.ts';

/** Ends when the server ends, for whatever reason; the watcher goes with it, lest it signals a number that is somebody else's by then. */
const SCRIPT = [
  '"$@" 3<&- & server=$!',
  'trap "" INT TERM HUP',
  '{ cat <&3; kill -INT $server; } >/dev/null 2>&1 & watcher=$!',
  'exec 3<&-',
  'wait $server',
  'kill -KILL $watcher 2>/dev/null',
].join('\n');

/** Crash recovery of a large write-ahead log may take this long. */
const START_TIMEOUT_MS = 120_000;
const LOG_KEPT = 4000;

export function launchWrapped(launch: Launch): Promise<Launched> {
  const settings = launch.settings.flatMap((setting) => ['-c', setting]);
  const child = spawn(
    '/bin/sh',
    [
      '-c',
      SCRIPT,
      'sh',
      launch.binaries.postgres,
      '-D',
      launch.folder,
      '-p',
      String(launch.port),
      ...settings,
    ],
    { ...launch.owner, cwd: launch.folder, detached: true, stdio: ['ignore', 'ignore', 'pipe', 'pipe'] },
  );
  const pipe = child.stdio[3] as Socket;
  const words = child.stdio[2] as Socket;
  // The reader may be gone already when we close.
  pipe.on('error', () => {});
  // Not the child's 'close': that waits for our own end of the pipe as well.
  const ended = Promise.all([once(child, 'exit'), once(words, 'close')]);
  let log = '';
  let isReady = false;
  return new Promise((answer) => {
    const refuse = (why: string) => {
      clearTimeout(timer);
      pipe.end();
      answer({ started: false, log: log + why });
    };
    const timer = setTimeout(() => refuse('no answer in time'), START_TIMEOUT_MS);
    ended.then(
      () => refuse(''),
      (error: unknown) => refuse(String(error)),
    );
    words.on('data', (chunk: Buffer) => {
      log = (log + chunk).slice(-LOG_KEPT);
      // Once: what it says while it ends must not undo that `stop` stays for it.
      if (isReady || !log.includes('ready to accept connections')) return;
      isReady = true;
      clearTimeout(timer);
      // Neither the child nor its pipes keep this process alive once it has nothing else to do.
      child.unref();
      words.unref();
      pipe.unref();
      answer({
        started: true,
        stop: async () => {
          child.ref();
          words.ref();
          pipe.end();
          await ended;
        },
      });
    });
  });
}
