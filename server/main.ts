/** `npm start`: everything in one process, with a database of its own unless one is configured. */
import { runProcess } from './run.ts';

await runProcess({ api: true, worker: true, embedded: true });
