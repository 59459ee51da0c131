/** The queue's side of the service: worker processes and the threads in which designs are computed. */
export type { ThreadAnswer, ThreadTask } from './answer.ts';
export { startWorker, type Worker, type WorkerOptions } from './worker.ts';
