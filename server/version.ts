/** The program's own version, from the nearest package.json above: the compiled tree lies a level deeper. */
import { existsSync, readFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { z } from 'zod';

const packageRule = z.object({ name: z.literal('ringbinder'), version: z.string() });

/** @throws Error when there is no package.json of this program above. */
export function readVersion(): string {
  for (let folder = dirname(fileURLToPath(import.meta.url)); ; folder = dirname(folder)) {
    const file = join(folder, 'package.json');
    if (existsSync(file)) return packageRule.parse(JSON.parse(readFileSync(file, 'utf8'))).version;
    if (folder === dirname(folder)) throw new Error('package.json was not found above the server');
  }
}
