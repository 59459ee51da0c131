/**
 * The threads in which designs are computed, so that a long computation neither holds up the process nor survives its
 * cancellation: aborting ends the thread (10 ms), and the pool starts another (about 75 ms, not waited for).
 *
 * A SharedArrayBuffer flag would cancel in 1 ms and keep the thread, but only where the core looks at it; ending the
 * thread needs nobody's cooperation.
 */
import { MessageChannel } from 'node:worker_threads';
import { Piscina } from 'piscina';
import type { ChipModelInput } from '../../schema/chip.ts';
import type { ThreadAnswer, ThreadTask } from './answer.ts';

/** A design needs a few MB; a runaway one must not take the process with it. */
const HEAP_LIMIT_MB = 512;

export interface Threads {
  /**
   * @param onProgress called with what the computation reports, on the caller's thread.
   * @throws the error of the computation, or the signal's abort.
   */
  compute(
    question: { readonly canonical: string; readonly model: ChipModelInput },
    onProgress: (fraction: number) => void,
    signal: AbortSignal,
  ): Promise<ThreadAnswer>;
  close(): Promise<void>;
}

/** Compiled, this file stands beside `design-thread.js`; from sources a thread needs the loader of the `.mjs`. */
function defaultThreadFile(): URL {
  const compiled = !import.meta.url.endsWith('.ts');
  return new URL(compiled ? './design-thread.js' : './design-thread.mjs', import.meta.url);
}

/** Starts `count` threads and returns when each has loaded the core. `file` must export what `design-thread.ts` does. */
export async function startThreads(count: number, file: URL = defaultThreadFile()): Promise<Threads> {
  const pool = new Piscina<unknown, ThreadAnswer>({
    filename: file.href,
    minThreads: count,
    maxThreads: count,
    resourceLimits: { maxOldGenerationSizeMb: HEAP_LIMIT_MB },
  });
  await Promise.all(Array.from({ length: count }, () => pool.run(undefined, { name: 'warm' })));
  return {
    async compute({ canonical, model }, onProgress, signal) {
      const { port1, port2 } = new MessageChannel();
      port1.on('message', onProgress);
      const task: ThreadTask = { canonical, model, port: port2 };
      try {
        return await pool.run(task, { name: 'design', signal, transferList: [port2] });
      } finally {
        port1.close();
      }
    },
    close: () => pool.destroy(),
  };
}
