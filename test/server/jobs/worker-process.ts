/** A worker as a process of its own, as `server/worker.ts` is one, with the threads that can be held up. */

import { startWorker } from '../../../server/jobs/index.ts';
import { createLogger } from '../../../server/logger.ts';
import { createStore } from '../../../server/store/index.ts';

const logger = createLogger('info');
const store = await createStore({ databaseUrl: process.env.DATABASE_URL!, logger });
const worker = await startWorker({
  store,
  logger,
  threads: Number(process.env.TEST_THREADS ?? 1),
  computationTimeoutS: Number(process.env.TEST_TIMEOUT_S ?? 60),
  drainS: Number(process.env.TEST_DRAIN_S ?? 0),
  threadFile: new URL('./slow-thread.mjs', import.meta.url),
});
process.once('SIGTERM', async () => {
  await worker.stop();
  await store.close();
  process.exit(0);
});
process.stdout.write('READY\n');
