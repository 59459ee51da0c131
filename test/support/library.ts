/** A small invented library for tests of the store and of what stands on it. Nothing in it is a real chip or person. */
import { createHash, randomUUID } from 'node:crypto';
import pg from 'pg';
import type { ChipModelInput } from '../../schema/chip.ts';
import type { SubmitAsk } from '../../server/store/index.ts';
import {
  type Acting,
  type ChipRecord,
  type ChipRevisionRecord,
  createStore,
  type Store,
} from '../../server/store/index.ts';
import type { Setting } from '../../src/chip/setting.ts';
import type { Design } from '../../src/design/design.ts';
import { createTestDatabase, type TestDatabase } from './postgres.ts';

export const sha256 = (text: string): string => createHash('sha256').update(text).digest('hex');

export const LIMITS = { openPerToken: 200, queue: 10_000 };

export interface Library {
  readonly store: Store;
  readonly database: TestDatabase;
  /** An actor with a DESIGNER token. */
  readonly by: Acting;
  query<T extends pg.QueryResultRow = Record<string, unknown>>(sql: string, values?: unknown[]): Promise<T[]>;
  /** A session of its own, to hold locks with. */
  session(): Promise<pg.Client>;
  close(): Promise<void>;
}

/** A store on a fresh database, with one person in it. */
export async function openLibrary(): Promise<Library> {
  const database = await createTestDatabase();
  const store = await createStore({ databaseUrl: database.url });
  const pool = new pg.Pool({ connectionString: database.url, max: 4 });
  pool.on('error', () => {});
  const sessions: pg.Client[] = [];
  const [system] = (await pool.query<{ id: string }>("select id from actor where kind = 'SYSTEM'")).rows;
  const token = await makeToken(
    store,
    { actorId: system!.id, tokenId: null },
    'invented-designer',
    'DESIGNER',
  );
  return {
    store,
    database,
    by: { actorId: token.actor.id, tokenId: token.id },
    query: async <T extends pg.QueryResultRow>(sql: string, values?: unknown[]) =>
      (await pool.query<T>(sql, values)).rows,
    async session() {
      const client = new pg.Client({ connectionString: database.url });
      client.on('error', () => {});
      await client.connect();
      sessions.push(client);
      return client;
    },
    async close() {
      for (const session of sessions) await session.end().catch(() => {});
      await pool.end();
      await store.close();
      await database.drop();
    },
  };
}

export async function makeToken(
  store: Store,
  by: Acting,
  actor: string,
  role: 'READER' | 'DESIGNER' | 'INSTRUMENT' | 'ADMIN',
  expiresAt: Date | null = null,
) {
  const made = await store.createToken(by, {
    actor,
    actorKind: role === 'INSTRUMENT' ? 'INSTRUMENT' : 'PERSON',
    role,
    label: 'invented',
    expiresAt,
    lookup: randomUUID().replaceAll('-', '').slice(0, 12),
    secretHash: createHash('sha256').update(randomUUID()).digest(),
  });
  if (made.outcome !== 'WRITTEN') throw new Error(made.outcome);
  return made.record;
}

export const MODEL: ChipModelInput = {
  referenceFrequencyThz: 193.1,
  fsr: { fsrGhz: 50 },
  cells: [
    {
      interferometer: {
        name: 'cell1',
        ringsPerArm: [1, 0],
        couplers: [
          { element: 'input', tunable: false, powerCrossCoupling: 0.5 },
          { element: 'output', tunable: false, powerCrossCoupling: 0.5 },
          { element: 'ring1', tunable: false, powerCrossCoupling: 0.3 },
        ],
      },
    },
  ],
  losses: { unitDelayLossDb: 0.1, couplerExcessLossDb: 0.05 },
  channels: [
    {
      channel: '01',
      drives: 'cell1.ring1.phase',
      phasePerMw: 0.12,
      phaseAtZeroRad: 0.4,
      resistanceOhm: 500,
      currentLimitMa: 12,
      powerLimitMw: 70,
      resolutionMa: 0.005,
    },
  ],
};

export function revisionText(
  serial: string,
  number: number,
  model: ChipModelInput,
): { canonical: string; hash: string } {
  const canonical = JSON.stringify({ kind: 'chipRevision', model, number, schema: 1, serial });
  return { canonical, hash: sha256(canonical) };
}

export interface TestChip {
  readonly chip: ChipRecord;
  readonly revision: ChipRevisionRecord;
}

export async function makeChip(
  { store, by }: Pick<Library, 'store' | 'by'>,
  serial: string,
): Promise<TestChip> {
  const made = await store.registerChip(by, {
    serial,
    description: 'invented',
    model: MODEL,
    ...revisionText(serial, 1, MODEL),
  });
  if (made.outcome !== 'WRITTEN') throw new Error(made.outcome);
  const revision = await store.findRevision(made.record.id, 1);
  if (!revision) throw new Error('no first revision');
  return { chip: made.record, revision };
}

/** A revision that differs from the head by its FSR. */
export function reviseAsk(chip: ChipRecord, expectedRevision: number, fsrGhz: number) {
  const model = { ...MODEL, fsr: { fsrGhz } };
  return {
    chipId: chip.id,
    expectedRevision,
    model,
    note: 'invented',
    canonicalOf: (number: number) => revisionText(chip.serial, number, model),
  };
}

/** A question whose address depends on `what`. */
export function questionOf({ chip, revision }: TestChip, what: string, engine = '1'): SubmitAsk {
  const canonical = JSON.stringify({ chipRevision: revision.hash, engine, kind: 'design', schema: 1, what });
  return {
    chipId: chip.id,
    chipRevisionId: revision.id,
    asked: { chip: chip.serial, what },
    key: sha256(canonical),
    canonical,
    engine,
  };
}

export const SETTING: Setting = {
  channels: [
    {
      channel: '01',
      drives: 'cell1.ring1.phase',
      state: 'ACTIVE',
      currentMa: 4.125,
      powerMw: 8.5078125,
      phaseRad: 1.4209375,
      wraps: 0,
      limitMa: 11.832159566199232,
    },
  ],
  totalPowerMw: 8.5078125,
  parked: [],
  cautions: [],
};

/** Shaped like a design; its numbers are invented and not those of any filter. */
export function inventedDesign(
  rejectionDb: number | null = 40,
  insertionLossDb: number | null = 0.8,
): Design {
  const record = { zeros: [], poles: [{ re: 0.1, im: -0.2 }], gain: { re: 0.3, im: 0 }, sections: [] };
  return {
    order: 1,
    centreGhz: 0,
    family: 'BUTTERWORTH',
    architecture: 'ALL_PASS_PAIR',
    reason: 'invented',
    alternatives: [],
    tradeOff: [],
    output: 'OUT1',
    transferFunctions: { OUT1: record, OUT2: record },
    cells: [],
    circuit: { cells: [], join: 'OUT1' } as unknown as Design['circuit'],
    setting: SETTING,
    mask: { kind: 'MASK', bands: [], reference: 'INPUT' } as unknown as Design['mask'],
    compliance: { met: true, reference: 'PEAK', worstMarginDb: 0.7, bands: [] },
    figures: {
      insertionLossDb,
      rippleDb: 0.3,
      rejectionDb,
      extinctionRatioDb: null,
      bandwidth1DbGhz: 10,
      bandwidth3DbGhz: 12,
      bandwidth20DbGhz: null,
      shapeFactor: null,
      groupDelayRipplePs: null,
      worstNeighbourIsolationDb: null,
      notDefined: [],
    },
  };
}

export async function submit({ store, by }: Pick<Library, 'store' | 'by'>, ask: SubmitAsk) {
  const made = await store.submitRequest(by, ask, LIMITS);
  if (made.outcome !== 'WRITTEN') throw new Error(`expected a request, got ${made.outcome}`);
  return made.record;
}

/** Asks, starts and finishes: a design in the library. */
export async function makeDesign(
  library: Pick<Library, 'store' | 'by'>,
  ask: SubmitAsk,
  design = inventedDesign(),
) {
  const request = await submit(library, ask);
  const started = await library.store.startComputation(request.computationId!);
  if (!started) throw new Error('not started');
  await library.store.finishComputation(started.id, started.attempt, design, sha256(JSON.stringify(design)));
  const record = await library.store.findDesign(ask.key);
  if (!record) throw new Error('no design');
  return record;
}

export async function saveVersion(
  { store, by }: Pick<Library, 'store' | 'by'>,
  { chip, revision }: TestChip,
  configuration: string,
  designId: string,
) {
  const saved = await store.saveVersion(by, {
    chipId: chip.id,
    configuration,
    designId,
    designRevisionId: revision.id,
    setting: SETTING,
    contentHash: sha256(JSON.stringify(SETTING)),
    note: 'invented',
  });
  if (saved.outcome !== 'WRITTEN') throw new Error(saved.outcome);
  return saved.record;
}

/** Whether a promise is still waiting after a while: long against a statement, short against the test. */
export async function isBlocked(promise: Promise<unknown>, waitMs = 200): Promise<boolean> {
  const settled = promise.then(
    () => false,
    () => false,
  );
  return Promise.race([settled, new Promise<boolean>((done) => setTimeout(() => done(true), waitMs))]);
}
