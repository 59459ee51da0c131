/**
 * One computation, from the queue's job to what is stored.
 *
 *   start ──null──▶ return: cancelled or finished meanwhile, nothing to do
 *     │
 *   compute in a thread ──▶ design ──▶ finish ──true──▶ return
 *     │                 └─▶ refusal ─▶ refuse ──true──▶ return (kept by address, never retried)
 *     │                                   └──false──▶ throw SupersededError
 *     ├─ CANCEL event ───────▶ thread ended, return (the queue's job is gone already)
 *     ├─ deadline ───────────▶ thread ended, refused with COMPUTATION_TIMED_OUT, return
 *     ├─ shutdown ───────────▶ thread ended, throw (the queue gives the job to others)
 *     ├─ progress refused ───▶ thread ended, throw SupersededError
 *     └─ any other error ────▶ throw (the queue tries again)
 *
 * "Throw" leaves the job in the queue, "return" removes it. Somebody else may hold the job by then (a process that was
 * cut off from the database for a while is taken for dead): the queue fails a job only for the one who holds it, but
 * completes it for anybody, so a superseded run must throw.
 */
import type { Logger } from 'pino';
import { problemOf, problemOfRefusal } from '../errors.ts';
import type { Computations } from '../store/index.ts';
import type { ThreadAnswer } from './answer.ts';
import { persist } from './persist.ts';
import type { Threads } from './threads.ts';
import { throttleRising } from './throttle.ts';

/** Progress writes of one computation: two a second. */
const PROGRESS_INTERVAL_MS = 500;

export interface ComputationDeps {
  readonly store: Pick<
    Computations,
    'startComputation' | 'reportProgress' | 'finishComputation' | 'refuseComputation'
  >;
  readonly threads: Threads;
  readonly logger: Logger;
  readonly timeoutS: number;
}

/** Another run of the same computation counts; this one's result does not. */
export class SupersededError extends Error {
  override readonly name = 'SupersededError';
}

type Stop = 'CANCELLED' | 'TIMED_OUT' | 'SUPERSEDED';

interface Run {
  readonly stop: (why: Stop) => void;
  readonly done: Promise<void>;
  successor?: Promise<void>;
}

export interface Computing {
  /** The queue's task. `shutdown` aborts when this process may no longer wait. */
  run(id: string, shutdown: AbortSignal): Promise<void>;
  /** Its last asker left. */
  cancel(id: string): void;
  readonly count: number;
}

export function computing(deps: ComputationDeps): Computing {
  const runs = new Map<string, Run>();
  return {
    run(id, shutdown) {
      const controller = new AbortController();
      const before = runs.get(id);
      let settle: (outcome: Promise<void>) => void = () => {};
      const run: Run = {
        stop: (why) => controller.abort(why),
        done: new Promise((resolve) => {
          settle = resolve;
        }),
      };
      // Registered before the computation is started: a cancellation that commits after the start finds it here.
      runs.set(id, run);
      if (before !== undefined) {
        // This very process was taken for dead and got its own job again. Both runs hold the job in the queue's eyes,
        // so the older one must end as the newer one does.
        before.successor = run.done;
        before.stop('SUPERSEDED');
      }
      settle(
        compute(deps, id, controller.signal, shutdown)
          .catch((error: unknown) => {
            if (error instanceof SupersededError && run.successor !== undefined) return run.successor;
            throw error;
          })
          .finally(() => {
            if (runs.get(id) === run) runs.delete(id);
          }),
      );
      return run.done;
    },
    cancel: (id) => runs.get(id)?.stop('CANCELLED'),
    get count() {
      return runs.size;
    },
  };
}

async function compute(
  deps: ComputationDeps,
  id: string,
  stop: AbortSignal,
  shutdown: AbortSignal,
): Promise<void> {
  const { store, threads, logger, timeoutS } = deps;
  const computation = await store.startComputation(id);
  if (computation === null) return;
  const { attempt, canonical, model } = computation;
  const log = logger.child({ computation: id, attempt });
  const superseded = (): never => {
    throw new SupersededError(`computation ${id}, attempt ${attempt}: another run counts`);
  };
  const inner = new AbortController();
  const deadline = setTimeout(() => inner.abort('TIMED_OUT' satisfies Stop), timeoutS * 1000);
  const progress = throttleRising((fraction) => {
    store.reportProgress(id, attempt, fraction).then(
      (accepted) => {
        if (!accepted) inner.abort('SUPERSEDED' satisfies Stop);
      },
      (error: unknown) => log.warn({ err: error }, 'progress not reported'),
    );
  }, PROGRESS_INTERVAL_MS);
  const signal = AbortSignal.any([stop, inner.signal, shutdown]);
  const startedAt = performance.now();
  let answer: ThreadAnswer;
  try {
    signal.throwIfAborted();
    answer = await threads.compute(
      { canonical, model },
      (fraction) => progress(Math.min(fraction, 1)),
      signal,
    );
  } catch (error) {
    const why = stop.aborted ? stop.reason : inner.signal.aborted ? inner.signal.reason : null;
    if (why === 'CANCELLED') return void log.info('computation cancelled');
    if (why === 'SUPERSEDED') return superseded();
    if (why === 'TIMED_OUT') {
      log.warn({ timeoutS }, 'computation timed out');
      const problem = problemOf(
        'COMPUTATION_TIMED_OUT',
        `The computation took longer than ${timeoutS} s and was ended.`,
      );
      if (await persist(() => store.refuseComputation(id, attempt, problem), shutdown, log)) return;
      return superseded();
    }
    throw error;
  } finally {
    clearTimeout(deadline);
    progress.stop();
  }
  const stored = await persist(
    () =>
      answer.outcome === 'DESIGN'
        ? store.finishComputation(id, attempt, answer.design, answer.resultHash)
        : store.refuseComputation(id, attempt, problemOfRefusal(answer.details)),
    shutdown,
    log,
  );
  if (!stored && !(stop.aborted && stop.reason === 'CANCELLED')) superseded();
  log.info(
    { outcome: answer.outcome, stored, ms: Math.round(performance.now() - startedAt) },
    'computation ended',
  );
}
