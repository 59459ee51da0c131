import { mkdtemp, readFile, rm, writeFile } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { expect, inject, it } from 'vitest';
import { diffSchema } from '../../../scripts/schema-engine.ts';

it('schema.prisma and the migrations agree, judged by the schema engine of Prisma [cross-check]', async () => {
  expect(await diffSchema(inject('postgresUrl'))).toBeNull();
});

it('a column that only schema.prisma has is noticed, so the check above can fail', async () => {
  const folder = await mkdtemp(join(tmpdir(), 'ringbinder-schema-'));
  try {
    const schema = await readFile('prisma/schema.prisma', 'utf8');
    const changed = join(folder, 'schema.prisma');
    await writeFile(changed, schema.replace('model Chip {', 'model Chip {\n  invented String?'));
    expect(await diffSchema(inject('postgresUrl'), changed)).toContain('ADD COLUMN     "invented" TEXT');
  } finally {
    await rm(folder, { recursive: true, force: true });
  }
});
