/** The one place where the operations come together. */
import {
  findChip,
  findChipById,
  findChipsById,
  findHeadRevisions,
  findRevision,
  findRevisionById,
  findRevisionsById,
  listChips,
  listRevisions,
} from './chip/find.ts';
import { registerChip } from './chip/register.ts';
import { reviseChip } from './chip/revise.ts';
import { finishComputation, refuseComputation } from './computation/finish.ts';
import { queueDepth } from './computation/queue-depth.ts';
import { registerWorker } from './computation/register-worker.ts';
import { reportProgress } from './computation/report-progress.ts';
import { startComputation } from './computation/start.ts';
import { sweep } from './computation/sweep.ts';
import {
  findConfiguration,
  findConfigurationById,
  findConfigurationsById,
  listConfigurations,
} from './configuration/find.ts';
import { saveVersion } from './configuration/save-version.ts';
import {
  findLatestVersions,
  findVersion,
  findVersionById,
  listVersions,
  listVersionsOfDesign,
} from './configuration/version.ts';
import { type Database, openDatabase, type StoreLogger } from './database.ts';
import { findDesign, findDesigns, findRefusal } from './design/find.ts';
import { listDesigns } from './design/list.ts';
import { findHistoryEntry, listHistory } from './history/list.ts';
import { migrate } from './migrate.ts';
import { listen } from './notifications.ts';
import {
  findRelease,
  findReleaseBySequence,
  findReleaseHead,
  listReleaseLog,
  listReleases,
  listReleasesOfChips,
  listReleasesOfVersion,
  listReleasesOfVersions,
} from './release/find.ts';
import { publishRelease } from './release/publish.ts';
import { cancelRequest } from './request/cancel.ts';
import { findRequest, listRequests } from './request/find.ts';
import { submitRequest } from './request/submit.ts';
import type { Store } from './store.ts';
import { guarded, isUnavailable, StoreUnavailable } from './unavailable.ts';
import { bootstrapAdmin, ensureSystemActor } from './who/bootstrap.ts';
import { createToken } from './who/create-token.ts';
import { findActors, findToken, findTokenById, listTokens } from './who/find.ts';
import { noteTokenUse } from './who/note-token-use.ts';
import { revokeToken } from './who/revoke-token.ts';

const POOL_SIZE = 20;

export interface StoreOptions {
  readonly databaseUrl: string;
  /** Connections of this process, those of its queue included. */
  readonly poolSize?: number;
  readonly logger?: StoreLogger;
}

type Operations = Omit<Store, 'notifications' | 'pool' | 'ping' | 'close'>;

function operationsOf(database: Database, systemId: string): Operations {
  const work: Database = { ...database, pool: database.workPool };
  return {
    findToken: findToken(database),
    findTokenById: findTokenById(database),
    listTokens: listTokens(database),
    createToken: createToken(database),
    revokeToken: revokeToken(database),
    noteTokenUse: noteTokenUse(database),
    bootstrapAdmin: bootstrapAdmin(database),
    findActors: findActors(database),

    findChip: findChip(database),
    findChipById: findChipById(database),
    findChipsById: findChipsById(database),
    listChips: listChips(database),
    findRevision: findRevision(database),
    findRevisionById: findRevisionById(database),
    findRevisionsById: findRevisionsById(database),
    findHeadRevisions: findHeadRevisions(database),
    listRevisions: listRevisions(database),
    registerChip: registerChip(database),
    reviseChip: reviseChip(database),

    findDesign: findDesign(database),
    findDesigns: findDesigns(database),
    findRefusal: findRefusal(database),
    listDesigns: listDesigns(database),
    submitRequest: submitRequest(database),
    findRequest: findRequest(database),
    listRequests: listRequests(database),
    cancelRequest: cancelRequest(database),

    startComputation: startComputation(work),
    reportProgress: reportProgress(work),
    finishComputation: finishComputation(work, systemId),
    refuseComputation: refuseComputation(work, systemId),
    registerWorker: registerWorker(database),
    sweep: sweep(database, systemId),
    queueDepth: queueDepth(database),

    findConfiguration: findConfiguration(database),
    findConfigurationById: findConfigurationById(database),
    findConfigurationsById: findConfigurationsById(database),
    listConfigurations: listConfigurations(database),
    findVersion: findVersion(database),
    findVersionById: findVersionById(database),
    findLatestVersions: findLatestVersions(database),
    listVersions: listVersions(database),
    listVersionsOfDesign: listVersionsOfDesign(database),
    saveVersion: saveVersion(database),

    findRelease: findRelease(database),
    findReleaseHead: findReleaseHead(database),
    findReleaseBySequence: findReleaseBySequence(database),
    listReleases: listReleases(database),
    listReleasesOfChips: listReleasesOfChips(database),
    listReleaseLog: listReleaseLog(database),
    listReleasesOfVersion: listReleasesOfVersion(database),
    listReleasesOfVersions: listReleasesOfVersions(database),
    publishRelease: publishRelease(database),

    listHistory: listHistory(database),
    findHistoryEntry: findHistoryEntry(database),
  };
}

/**
 * Brings the schema up to date (any number of processes at once), then opens the store.
 * @throws StoreUnavailable when the database is away; Error when a migration cannot be applied
 */
export async function createStore(options: StoreOptions): Promise<Store> {
  const logger = options.logger ?? { info: () => {}, warn: () => {} };
  const database = openDatabase(options.databaseUrl, options.poolSize ?? POOL_SIZE, logger);
  const closeDatabase = async (): Promise<void> => {
    await database.prisma.$disconnect();
    for (const pool of [database.pool, database.workPool]) if (!pool.ended) await pool.end();
  };
  try {
    const applied = await migrate(options.databaseUrl);
    if (applied.length > 0) logger.info({ applied }, 'migrations applied');
    const systemId = await ensureSystemActor(database);
    const notifications = await listen(database);
    let closing: Promise<void> | undefined;
    return {
      ...guarded(operationsOf(database, systemId)),
      notifications,
      pool: database.workPool,
      async ping() {
        return database.pool.query('select 1').then(
          () => true,
          () => false,
        );
      },
      close() {
        closing ??= notifications.close().then(closeDatabase);
        return closing;
      },
    };
  } catch (error) {
    await closeDatabase().catch(() => {});
    throw isUnavailable(error)
      ? new StoreUnavailable('the database cannot be reached', { cause: error })
      : error;
  }
}
