/** `npm run worker`: a worker alone, any number of processes against one DATABASE_URL. */
import { runProcess } from './run.ts';

await runProcess({ api: false, worker: true, embedded: false });
