// The real computation, held up first: long enough to kill its process, cancel it or let it time out. How long, the
// environment says; a mask band labelled "crash" ends the thread instead.
import { register } from 'tsx/esm/api';

register();
const real = await import('../../../server/jobs/design-thread.ts');
const SLICE_MS = 20;

export const warm = real.warm;

export function design(task) {
  const slices = Number(process.env.TEST_HOLD_MS ?? 0) / SLICE_MS;
  const clock = new Int32Array(new SharedArrayBuffer(4));
  for (let slice = 1; slice <= slices; slice++) {
    Atomics.wait(clock, 0, 0, SLICE_MS);
    task.port.postMessage((0.9 * slice) / slices);
  }
  if (task.canonical.includes('"label":"crash"')) process.exit(3);
  return real.design(task);
}
