/** The end of a process: waits end at once, and every connection closes with the answer it is about to get. */
import type { FastifyInstance } from 'fastify';
import type { Waiting } from '../waiting.ts';

export function registerDraining(app: FastifyInstance, waiting: Waiting): void {
  let isDraining = false;
  app.addHook('preClose', async () => {
    isDraining = true;
    waiting.drain();
  });
  // A connection kept alive after its answer would hold the process for as long as it may stay idle.
  app.addHook('onSend', (_request, reply, payload, done) => {
    if (isDraining) reply.header('connection', 'close');
    done(null, payload);
  });
}
