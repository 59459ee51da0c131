/** The database that the service would use here: DATABASE_URL, else the embedded one, started or, when the service runs, joined. */
import { readConfig } from '../server/config.ts';
import { startEmbedded } from '../server/embedded/index.ts';

export async function openDatabaseOfService(): Promise<{ url: string; close(): Promise<void> }> {
  const config = readConfig(process.env);
  if (config.databaseUrl !== null && config.databaseUrl !== undefined) {
    return { url: config.databaseUrl, close: async () => {} };
  }
  const say = (_fields: object, text: string): void => console.error(text);
  const server = await startEmbedded({ folder: config.dataFolder, logger: { info: say, warn: say } });
  return { url: server.url, close: server.stop };
}
