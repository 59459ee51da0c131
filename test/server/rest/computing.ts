/** Computations by hand, so that a test decides when one starts, moves on and ends. The numbers come from the core. */

import { createHash } from 'node:crypto';
import { chipModelOf } from '../../../schema/chip.ts';
import { canonicalJson } from '../../../schema/jcs.ts';
import { problemOf, problemOfRefusal } from '../../../server/errors.ts';
import type { Store } from '../../../server/store/index.ts';
import { computeDesign, type DesignQuestion } from '../../../src/design/index.ts';
import { Refusal } from '../../../src/errors.ts';

export interface Computing {
  progress(fraction: number): Promise<void>;
  /** The core's own answer, design or refusal. */
  finish(): Promise<void>;
  fail(): Promise<void>;
}

async function oldestQueued(store: Store): Promise<string | undefined> {
  const { rows } = await store.pool.query<{ id: string }>(
    `select id from computation where state = 'QUEUED' order by id limit 1`,
  );
  return rows[0]?.id;
}

export const isAnythingQueued = async (store: Store): Promise<boolean> =>
  (await oldestQueued(store)) !== undefined;

/** A request sent a moment ago is queued by then, even on a busy machine. */
const ARRIVAL_MS = 10_000;

/** Starts the oldest computation that is queued, or the next one to come. */
export async function startNext(store: Store): Promise<Computing> {
  const end = performance.now() + ARRIVAL_MS;
  let id = await oldestQueued(store);
  while (id === undefined && performance.now() < end) {
    await new Promise((resolve) => setTimeout(resolve, 20));
    id = await oldestQueued(store);
  }
  const started = id === undefined ? null : await store.startComputation(id);
  if (!id || !started) throw new Error('nothing is queued');
  const { attempt, canonical, model } = started;
  return {
    async progress(fraction) {
      await store.reportProgress(id, attempt, fraction);
    },
    async finish() {
      const { specification, synthesis } = JSON.parse(canonical) as DesignQuestion;
      try {
        const design = computeDesign({ specification, synthesis }, chipModelOf(model), {});
        const resultHash = createHash('sha256').update(canonicalJson(design), 'utf8').digest('hex');
        await store.finishComputation(id, attempt, design, resultHash);
      } catch (error) {
        if (!(error instanceof Refusal)) throw error;
        await store.refuseComputation(id, attempt, problemOfRefusal(error.details));
      }
    },
    async fail() {
      await store.refuseComputation(
        id,
        attempt,
        problemOf('COMPUTATION_TIMED_OUT', 'It took longer than 1 s.'),
      );
    },
  };
}
