/**
 * What the service is measured against: Fastify as it comes, one prepared select by key, nothing else. Every path
 * answers one row of the service's own database, as JSON: read anew (`/select/…`) or held in memory (`/json/…`).
 */
import Fastify from 'fastify';
import pg from 'pg';

const TABLES = {
  design: 'select id, canonical, result, result_hash, created_at from design where id = $1',
  version: 'select id, number, setting, content_hash, created_at from configuration_version where id = $1',
  // By the chip's serial; what tells whether anything changed.
  head: `select h.name, h.sequence, v.content_hash from chip c join release_head h on h.chip_id = c.id
    join release e on e.chip_id = h.chip_id and e.name = h.name and e.sequence = h.sequence
    join configuration_version v on v.id = e.version_id where c.serial = $1 and h.name = 'current'`,
} as const;

/** As many as the service keeps. */
const POOL_SIZE = 20;

const pool = new pg.Pool({ connectionString: process.env.DATABASE_URL, max: POOL_SIZE });
const app = Fastify();
const held = new Map<string, unknown>();

async function read(table: keyof typeof TABLES, id: string): Promise<unknown> {
  const { rows } = await pool.query({ name: table, text: TABLES[table], values: [id] });
  if (rows.length === 0) throw new Error(`no ${table} ${id}`);
  return rows[0];
}

for (const table of ['design', 'version', 'head'] as const) {
  app.get<{ Params: { id: string } }>(`/select/${table}/:id`, async (request) =>
    read(table, request.params.id),
  );
  app.get<{ Params: { id: string } }>(`/json/${table}/:id`, async (request) => {
    const { id } = request.params;
    const row = held.get(id) ?? (await read(table, id));
    held.set(id, row);
    return row;
  });
}

console.log(`listening on ${await app.listen({ host: '127.0.0.1', port: 0 })}`);
