/** `npm run backup -- FILE`: the whole library at one moment, while the service runs. Never overwrites. */
import { once } from 'node:events';
import { createWriteStream } from 'node:fs';
import { rm } from 'node:fs/promises';
import { backup } from '../server/store/index.ts';
import { openDatabaseOfService } from './database-of-service.ts';

const file = process.argv[2];
if (file === undefined) {
  console.error('usage: npm run backup -- FILE.ringbinder.gz');
  process.exit(2);
}
const database = await openDatabaseOfService();
// Hashes of tokens are in it: for its owner's eyes alone.
const output = createWriteStream(file, { flags: 'wx', mode: 0o600 });
let opened = false;
try {
  await once(output, 'open');
  opened = true;
  const rows = await backup(database.url, output);
  console.log(
    `${file}: ${Object.entries(rows)
      .map(([table, count]) => `${table} ${count}`)
      .join(', ')}`,
  );
} catch (error) {
  if (opened) await rm(file, { force: true });
  console.error(`no backup: ${error instanceof Error ? error.message : String(error)}`);
  process.exitCode = 1;
} finally {
  await database.close();
}
