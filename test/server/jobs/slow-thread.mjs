// The real computation, held up first: long enough to kill its process, cancel it or let it time out. How long, the
// environment says; a mask band labelled "crash" ends the thread instead, one labelled "endless" lets the core's first
// progress report throw what an iteration throws at its cap.
import { register } from 'tsx/esm/api';

register();
const real = await import('../../../server/jobs/design-thread.ts');
const { NoConvergence } = await import('../../../src/errors.ts');
const SLICE_MS = 20;

/** Throws from within the core, as an iteration of its own would. */
const notConverging = {
  postMessage() {
    throw new NoConvergence('invented iteration', 40, 0.125);
  },
};

export const warm = real.warm;

export function design(task) {
  const slices = Number(process.env.TEST_HOLD_MS ?? 0) / SLICE_MS;
  const clock = new Int32Array(new SharedArrayBuffer(4));
  for (let slice = 1; slice <= slices; slice++) {
    Atomics.wait(clock, 0, 0, SLICE_MS);
    task.port.postMessage((0.9 * slice) / slices);
  }
  if (task.canonical.includes('"label":"crash"')) process.exit(3);
  const isEndless = task.canonical.includes('"label":"endless"');
  return real.design(isEndless ? { ...task, port: notConverging } : task);
}
