/** Starts the embedded database on the given folder, says where, and stays until it is killed. */
import { register } from 'tsx/esm/api';

register();
const { startEmbedded } = await import('../../../server/embedded/index.ts');
const quiet = { info: () => {}, warn: () => {} };
const [, , folder, launcher] = process.argv;
const server = await startEmbedded({ folder, logger: quiet, launcher });
process.send({ url: server.url, adopted: server.adopted });
process.on('message', async () => {
  await server.stop();
  process.exit(0);
});
setInterval(() => {}, 1000);
