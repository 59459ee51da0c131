/** `npm run migration:new -- name`: writes what schema.prisma has and the migrations lack as the next migration, to be completed by hand (CHECKs, triggers). */
import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { startEmbedded } from '../server/embedded/index.ts';
import { diffSchema } from './schema-engine.ts';

const name = process.argv[2] ?? '';
if (!/^[a-z][a-z0-9_]*$/.test(name)) {
  console.error('usage: npm run migration:new -- name_in_lower_case');
  process.exit(2);
}
const folder = mkdtempSync(join(tmpdir(), 'ringbinder-shadow-'));
const server = await startEmbedded({
  folder: join(folder, 'postgres'),
  durable: false,
  logger: { info: () => {}, warn: () => {} },
});
try {
  const sql = await diffSchema(server.url);
  if (sql === null) {
    console.log('schema.prisma and the migrations agree');
  } else {
    const place = `prisma/migrations/${new Date().toISOString().replace(/\D/g, '').slice(0, 14)}_${name}`;
    mkdirSync(place, { recursive: true });
    writeFileSync(join(place, 'migration.sql'), sql);
    console.log(`${place}/migration.sql\n\n${sql}`);
  }
} finally {
  await server.stop();
  rmSync(folder, { recursive: true, force: true });
}
