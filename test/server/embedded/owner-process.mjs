/**
 * Starts the embedded database on the given folder, says where, and stays until it is killed. Told to stop it has
 * nothing left but the stop under way, and exits with a code of its own once that has ended.
 */
import { register } from 'tsx/esm/api';

register();
const { startEmbedded } = await import('../../../server/embedded/index.ts');
const quiet = { info: () => {}, warn: () => {} };
const [, , folder, launcher] = process.argv;
const server = await startEmbedded({ folder, logger: quiet, launcher });
process.send({ url: server.url, adopted: server.adopted });
const staying = setInterval(() => {}, 1000);
process.once('message', async () => {
  clearInterval(staying);
  process.disconnect();
  await server.stop();
  process.exit(7);
});
