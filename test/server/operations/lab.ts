/** A store, its operations and one viewer a role: what the tests of the operations need. Everything in it is invented. */
import { createHash } from 'node:crypto';
import { chipModelOf } from '../../../schema/chip.ts';
import { canonicalJson } from '../../../schema/jcs.ts';
import type { Problem } from '../../../schema/problem.ts';
import {
  createAuthenticator,
  ensureFirstAdmin,
  generateToken,
  type Viewer,
} from '../../../server/auth/index.ts';
import { ProblemError } from '../../../server/errors.ts';
import { createOperations, type DesignRequest, type Operations } from '../../../server/operations/index.ts';
import { createStore, type Role, type Store } from '../../../server/store/index.ts';
import { computeDesign, type DesignQuestion } from '../../../src/design/index.ts';
import { smallModel } from '../../schema/invented-models.ts';
import { createTestDatabase, type TestDatabase } from '../../support/postgres.ts';

export interface Lab {
  readonly store: Store;
  readonly operations: Operations;
  readonly viewers: Readonly<Record<Role, Viewer>>;
  /** Another person of the role DESIGNER. */
  readonly colleague: Viewer;
  /** Does what a worker does with the computation of a request. */
  compute(request: DesignRequest): Promise<void>;
  refuse(request: DesignRequest, problem: Problem): Promise<void>;
  countRows(table: string): Promise<number>;
  close(): Promise<void>;
}

export async function openLab(): Promise<Lab> {
  const database: TestDatabase = await createTestDatabase();
  const store = await createStore({ databaseUrl: database.url });
  const operations = createOperations({ store, version: '0.0.0-test' });
  const authenticator = createAuthenticator({ store });
  const first = generateToken().token;
  await ensureFirstAdmin(store, first);
  const admin = await authenticator.authenticate(`Bearer ${first}`);
  const newViewer = async (role: Role, actor = `invented ${role.toLowerCase()}`) => {
    const { secret } = await operations.createToken(admin, { actor, role, label: 'test' });
    return authenticator.authenticate(`Bearer ${secret}`);
  };
  const viewers = {
    READER: await newViewer('READER'),
    DESIGNER: await newViewer('DESIGNER'),
    INSTRUMENT: await newViewer('INSTRUMENT'),
    ADMIN: admin,
  };
  const colleague = await newViewer('DESIGNER', 'invented colleague');
  await operations.registerChip(viewers.DESIGNER, { serial: 'X1', model: smallModel() });

  async function start(request: DesignRequest) {
    const started = await store.startComputation(request.computationId ?? '');
    if (started === null) throw new Error('nothing to compute');
    return started;
  }

  return {
    store,
    operations,
    viewers,
    colleague,
    async compute(request) {
      const { id, attempt, canonical, model } = await start(request);
      const { specification, synthesis } = JSON.parse(canonical) as DesignQuestion;
      const design = computeDesign({ specification, synthesis }, chipModelOf(model), {});
      const resultHash = createHash('sha256').update(canonicalJson(design)).digest('hex');
      if (!(await store.finishComputation(id, attempt, design, resultHash))) throw new Error('fenced off');
    },
    async refuse(request, problem) {
      const { id, attempt } = await start(request);
      if (!(await store.refuseComputation(id, attempt, problem))) throw new Error('fenced off');
    },
    async countRows(table) {
      const { rows } = await store.pool.query<{ n: number }>(`select count(*)::int as n from ${table}`);
      return rows[0]?.n ?? 0;
    },
    async close() {
      authenticator.close();
      await store.close();
      await database.drop();
    },
  };
}

/** The problem that a piece of work is refused with. */
export async function refusalOf(work: Promise<unknown>): Promise<Problem> {
  try {
    await work;
  } catch (error) {
    if (error instanceof ProblemError) return error.problem;
    throw error;
  }
  throw new Error('it was not refused');
}

/** A second-order filter that the invented chip can make. */
export function easyRequest(half = 6) {
  return {
    chip: 'X1',
    specification: {
      family: {
        family: 'BUTTERWORTH',
        shape: 'LOW_PASS',
        order: 2,
        band: { offsetGhz: { low: -half, high: half } },
        output: 'OUT2',
      },
    },
  };
}
