/**
 * Prisma's schema engine as WebAssembly: its own command line would download a native one. Needed to compare
 * schema.prisma with the migrations, and to write the next migration; never at run time.
 */
import { randomUUID } from 'node:crypto';
import { existsSync, readdirSync, readFileSync } from 'node:fs';
import { createRequire } from 'node:module';
import { join, resolve } from 'node:path';
import { PrismaPg } from '@prisma/adapter-pg';
import type {
  SqlDriverAdapter,
  SqlMigrationAwareDriverAdapterFactory,
  SqlQuery,
} from '@prisma/driver-adapter-utils';
import { bindMigrationAwareSqlAdapterFactory, ColumnTypeEnum } from '@prisma/driver-adapter-utils';
import * as bindings from '@prisma/schema-engine-wasm/schema_engine_bg';
import type { PoolConfig, QueryResult } from 'pg';

/** PostgreSQL's catalog type "char", which introspection reads and the adapter cannot decode. */
const CHAR_OID = 18;
const TEXT_OID = 25;

/** Members of the adapter that its types do not show. */
type OpenAdapter = SqlDriverAdapter & {
  client: { query(sql: string): Promise<unknown> };
  performIO(query: SqlQuery): Promise<QueryResult>;
};

function decodeChar(adapter: OpenAdapter): void {
  let columns: number[] = [];
  const performIO = adapter.performIO.bind(adapter);
  const queryRaw = adapter.queryRaw.bind(adapter);
  adapter.performIO = async (query) => {
    const result = await performIO(query);
    columns = [];
    for (const [index, field] of (result.fields ?? []).entries()) {
      if (field.dataTypeID !== CHAR_OID) continue;
      field.dataTypeID = TEXT_OID;
      columns.push(index);
    }
    return result;
  };
  adapter.queryRaw = async (query) => {
    const result = await queryRaw(query);
    for (const index of columns) result.columnTypes[index] = ColumnTypeEnum.Character;
    return result;
  };
}

async function connect(config: PoolConfig): Promise<OpenAdapter> {
  const adapter = (await new PrismaPg(config).connect()) as unknown as OpenAdapter;
  decodeChar(adapter);
  // The adapter's own splits at every semicolon and breaks function bodies.
  adapter.executeScript = async (sql) => {
    await adapter.client.query(sql);
  };
  return adapter;
}

/** The adapter's own drops the shadow database before it closes its pool, which PostgreSQL refuses. */
async function connectToShadow(config: PoolConfig): Promise<SqlDriverAdapter> {
  const database = `shadow_${randomUUID()}`;
  const server = await connect(config);
  await server.executeScript(`create database "${database}"`);
  const shadow = await connect({ ...config, database });
  const dispose = shadow.dispose.bind(shadow);
  shadow.dispose = async () => {
    await dispose();
    await server.executeScript(`drop database "${database}" with (force)`);
    await server.dispose();
  };
  return shadow;
}

/** The project is compiled without the browser's types, where WebAssembly is declared. */
const wasm = (
  globalThis as unknown as {
    WebAssembly: {
      instantiate(
        bytes: Uint8Array,
        imports: object,
      ): Promise<{ instance: { exports: { __wbindgen_start(): void } } }>;
    };
  }
).WebAssembly;

let loading: Promise<void> | undefined;

/** Once per process: the glue module holds one instance. */
function loadWasm(): Promise<void> {
  loading ??= (async () => {
    const glue = createRequire(import.meta.url).resolve('@prisma/schema-engine-wasm/schema_engine_bg');
    const bytes = readFileSync(join(glue, '../schema_engine_bg.wasm'));
    Object.assign(globalThis, {
      PRISMA_WASM_PANIC_REGISTRY: { set_message: (text: string) => console.error(text) },
    });
    const { instance } = await wasm.instantiate(bytes, { './schema_engine_bg.js': bindings });
    const glueApi = bindings as unknown as { __wbg_set_wasm(exports: unknown): void };
    glueApi.__wbg_set_wasm(instance.exports);
    instance.exports.__wbindgen_start();
  })();
  return loading;
}

function readMigrations(folder: string): object {
  const base = resolve(folder);
  const lock = join(base, 'migration_lock.toml');
  const names = readdirSync(base, { withFileTypes: true })
    .filter((entry) => entry.isDirectory())
    .map((entry) => entry.name)
    .sort();
  return {
    baseDir: base,
    lockfile: { path: 'migration_lock.toml', content: existsSync(lock) ? readFileSync(lock, 'utf8') : null },
    shadowDbInitScript: '',
    migrationDirectories: names.map((path) => ({
      path,
      migrationFile: {
        path: 'migration.sql',
        content: { tag: 'ok', value: readFileSync(join(base, path, 'migration.sql'), 'utf8') },
      },
    })),
  };
}

/**
 * The SQL that would bring the migrations, replayed on a shadow database, to schema.prisma; null when they agree.
 * @param serverUrl a server where databases may be created
 */
export async function diffSchema(
  serverUrl: string,
  schemaPath = 'prisma/schema.prisma',
  migrations = 'prisma/migrations',
): Promise<string | null> {
  await loadWasm();
  const url = new URL(serverUrl);
  const config: PoolConfig = {
    host: url.hostname,
    port: Number(url.port),
    user: decodeURIComponent(url.username),
    password: decodeURIComponent(url.password),
    database: url.pathname.slice(1),
  };
  const factory = {
    provider: 'postgres',
    adapterName: 'migrations',
    connect: () => connect(config),
    connectToShadowDb: () => connectToShadow(config),
  } as unknown as SqlMigrationAwareDriverAdapterFactory;
  const files = [{ path: resolve(schemaPath), content: readFileSync(schemaPath, 'utf8') }];
  const engine = await bindings.SchemaEngine.new(
    { datamodels: files.map((file) => [file.path, file.content]) },
    () => {},
    bindMigrationAwareSqlAdapterFactory(factory) as never,
  );
  const result = await engine.diff({
    from: { tag: 'migrations', ...readMigrations(migrations) },
    to: { tag: 'schemaDatamodel', files },
    script: true,
    exitCode: true,
    filters: { externalTables: [], externalEnums: [] },
  } as never);
  return result.exitCode === 2 ? (result.stdout ?? '') : null;
}
