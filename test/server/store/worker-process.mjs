/** A worker process as the store sees one: registers, says so, and stays until it is killed. */
import { register } from 'tsx/esm/api';

register();
const { createStore } = await import('../../../server/store/index.ts');
const store = await createStore({ databaseUrl: process.argv[2], poolSize: 2 });
await store.registerWorker(['w-forked'], '1');
process.send('registered');
setInterval(() => {}, 1000);
