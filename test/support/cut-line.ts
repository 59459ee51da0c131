/** A TCP line to a server that can be cut and mended: what a database that goes away looks like from outside. */
import { connect, createServer, type Socket } from 'node:net';

export interface CutLine {
  /** The same URL, through the line. */
  readonly url: string;
  /** Drops every connection and refuses new ones. */
  cut(): void;
  mend(): void;
  close(): Promise<void>;
}

export async function openLine(serverUrl: string): Promise<CutLine> {
  const target = new URL(serverUrl);
  const open = new Set<Socket>();
  let isCut = false;
  const server = createServer((near) => {
    if (isCut) {
      near.destroy();
      return;
    }
    const far = connect(Number(target.port || 5432), target.hostname);
    for (const socket of [near, far]) {
      open.add(socket);
      socket.on('error', () => {});
      socket.on('close', () => {
        open.delete(socket);
        near.destroy();
        far.destroy();
      });
    }
    near.pipe(far).pipe(near);
  });
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
  const address = server.address();
  if (typeof address !== 'object' || address === null) throw new Error('the line does not listen');
  const near = new URL(serverUrl);
  near.hostname = '127.0.0.1';
  near.port = String(address.port);
  const dropAll = (): void => {
    for (const socket of open) socket.destroy();
  };
  return {
    url: near.href,
    cut() {
      isCut = true;
      dropAll();
    },
    mend() {
      isCut = false;
    },
    close() {
      dropAll();
      return new Promise((resolve) => server.close(() => resolve()));
    },
  };
}
