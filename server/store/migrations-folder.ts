import { existsSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';

/** The nearest `prisma/migrations` above this file: the compiled tree lies one level deeper than the sources. */
export function findMigrations(): string {
  let folder = dirname(fileURLToPath(import.meta.url));
  for (;;) {
    const candidate = join(folder, 'prisma', 'migrations');
    if (existsSync(candidate)) return candidate;
    const parent = dirname(folder);
    if (parent === folder) throw new Error('prisma/migrations was not found above the server');
    folder = parent;
  }
}
