/** The end of a process: waits end at once, and every connection closes with the answer it is about to get. */
import type { Socket } from 'node:net';
import type { FastifyInstance } from 'fastify';
import type { Waiting } from '../waiting.ts';

/** What is still being answered then is cut off, ms: plots and long curves take a second, waits have ended already. */
const LONGEST_DRAIN_MS = 10_000;

export function registerDraining(app: FastifyInstance, waiting: Waiting): void {
  let isDraining = false;
  // Node counts a connection without any request yet as busy, and browsers open such ones ahead of need.
  const unused = new Set<Socket>();
  app.server.on('connection', (socket: Socket) => {
    unused.add(socket);
    socket.once('close', () => unused.delete(socket));
  });
  app.addHook('onRequest', (request, _reply, done) => {
    unused.delete(request.raw.socket);
    done();
  });
  app.addHook('preClose', async () => {
    isDraining = true;
    waiting.drain();
    for (const socket of unused) socket.destroy();
    setTimeout(() => app.server.closeAllConnections(), LONGEST_DRAIN_MS).unref();
  });
  // A connection kept alive after its answer would hold the process for as long as it may stay idle.
  app.addHook('onSend', (_request, reply, payload, done) => {
    if (isDraining) reply.header('connection', 'close');
    done(null, payload);
  });
}
