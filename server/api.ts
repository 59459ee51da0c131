/** `npm run api`: the API alone, any number of processes against one DATABASE_URL. */
import { runProcess } from './run.ts';

await runProcess({ api: true, worker: false, embedded: false });
