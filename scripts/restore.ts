/** `npm run restore -- FILE`: fills an empty database; one that holds anything is left alone. Stop the service first. */
import { createReadStream } from 'node:fs';
import { restore } from '../server/store/index.ts';
import { openDatabaseOfService } from './database-of-service.ts';

const file = process.argv[2];
if (file === undefined) {
  console.error('usage: npm run restore -- FILE.ringbinder.gz');
  process.exit(2);
}
const database = await openDatabaseOfService();
try {
  const rows = await restore(database.url, createReadStream(file));
  console.log(
    `restored: ${Object.entries(rows)
      .map(([table, count]) => `${table} ${count}`)
      .join(', ')}`,
  );
} catch (error) {
  console.error(`nothing was restored: ${error instanceof Error ? error.message : String(error)}`);
  process.exitCode = 1;
} finally {
  await database.close();
}
