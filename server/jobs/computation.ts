/**
 * One computation, from the queue's job to what is stored.
 *
 *   start ──null──▶ return: cancelled or finished meanwhile, nothing to do
 *     │
 *   compute in a thread ──▶ design ──▶ finish ──true──▶ return
 *     │                 └─▶ refusal ─▶ refuse ──true──▶ return (kept by address, never retried)
 *     │                 │                 └──false──▶ throw SupersededError
 *     │                 └─▶ no convergence ─▶ refuse with COMPUTATION_CRASHED, as above, but not kept by address:
 *     │                     the core is deterministic, a second try ends the same, and the next engine may do better
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
import type { ComputationRecord, Computations, Store } from '../store/index.ts';
import type { ThreadAnswer } from './answer.ts';
import { persist } from './persist.ts';
import type { Threads } from './threads.ts';
import { throttleRising } from './throttle.ts';

/** Progress writes of one computation: two a second. */
const PROGRESS_INTERVAL_MS = 500;
/** Most designs take less than this; their one report would only be in the way of the answer. */
const PROGRESS_QUIET_MS = 100;

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
class SupersededError extends Error {
  override readonly name = 'SupersededError';
}

type Stop = 'CANCELLED' | 'TIMED_OUT' | 'SUPERSEDED';

interface Run {
  /** Its reason is a `Stop`; the first one counts. */
  readonly stopping: AbortController;
  readonly shutdown: AbortSignal;
  done: Promise<void>;
  successor?: Promise<void>;
  /** Asks the store whether this run still counts. */
  recheck: () => void;
}

export interface Computing {
  /** The queue's task. `shutdown` aborts when this process may no longer wait. */
  run(id: string, shutdown: AbortSignal): Promise<void>;
  /** Its last asker left. */
  cancel(id: string): void;
  /** Events may have been missed: every run asks whether it still counts. */
  recheck(): void;
  readonly count: number;
}

export function computing(deps: ComputationDeps): Computing {
  const runs = new Map<string, Run>();
  return {
    run(id, shutdown) {
      const before = runs.get(id);
      const run: Run = {
        stopping: new AbortController(),
        shutdown,
        done: Promise.resolve(),
        recheck: () => {},
      };
      // Registered before the computation is started: a cancellation that commits after the start finds it here.
      runs.set(id, run);
      run.done = compute(deps, id, run)
        .catch((error: unknown) => {
          if (error instanceof SupersededError && run.successor !== undefined) return run.successor;
          throw error;
        })
        .finally(() => {
          if (runs.get(id) === run) runs.delete(id);
        });
      if (before !== undefined) {
        // This very process was taken for dead and got its own job again. Both runs hold the job in the queue's eyes,
        // so the older one must end as the newer one does.
        before.successor = run.done;
        before.stopping.abort('SUPERSEDED' satisfies Stop);
      }
      return run.done;
    },
    cancel: (id) => runs.get(id)?.stopping.abort('CANCELLED' satisfies Stop),
    recheck: () => {
      for (const run of runs.values()) run.recheck();
    },
    get count() {
      return runs.size;
    },
  };
}

async function compute(deps: ComputationDeps, id: string, run: Run): Promise<void> {
  const computation = await deps.store.startComputation(id);
  if (computation === null) return;
  const { attempt } = computation;
  const logger = deps.logger.child({ computation: id, attempt });
  const startedAt = performance.now();
  const answer = await answerOf({ ...deps, logger }, computation, run);
  const stored =
    typeof answer === 'object' || answer === 'TIMED_OUT'
      ? await persist(() => store(deps, computation, answer), run.shutdown, logger)
      : false;
  const outcome = typeof answer === 'object' ? answer.outcome : answer;
  logger.info({ outcome, stored, ms: Math.round(performance.now() - startedAt) }, 'computation ended');
  if (!stored && run.stopping.signal.reason !== ('CANCELLED' satisfies Stop))
    throw new SupersededError(`computation ${id}, attempt ${attempt}: another run counts`);
}

type Started = NonNullable<Awaited<ReturnType<Store['startComputation']>>>;

/** What the thread answers, or why it was ended. @throws what the computation throws, and at shutdown. */
async function answerOf(
  { store, threads, logger, timeoutS }: ComputationDeps,
  { id, attempt, canonical, model }: Started,
  run: Run,
): Promise<ThreadAnswer | Stop> {
  const stop = (why: Stop): void => run.stopping.abort(why);
  let reached = 0;
  const report = (fraction: number): void => {
    reached = fraction;
    store.reportProgress(id, attempt, fraction).then(
      (counts) => {
        if (!counts) stop('SUPERSEDED');
      },
      (error: unknown) => logger.warn({ err: error }, 'progress not reported'),
    );
  };
  const progress = throttleRising(report, PROGRESS_INTERVAL_MS, PROGRESS_QUIET_MS);
  const deadline = setTimeout(() => stop('TIMED_OUT'), timeoutS * 1000);
  run.recheck = () => report(reached);
  try {
    const signal = AbortSignal.any([run.stopping.signal, run.shutdown]);
    signal.throwIfAborted();
    return await threads.compute({ canonical, model }, (fraction) => progress(Math.min(fraction, 1)), signal);
  } catch (error) {
    if (run.stopping.signal.aborted) return run.stopping.signal.reason as Stop;
    throw error;
  } finally {
    clearTimeout(deadline);
    progress.stop();
    run.recheck = () => {};
  }
}

/** False: fenced off. */
function store(
  deps: ComputationDeps,
  { id, attempt }: Pick<ComputationRecord, 'id' | 'attempt'>,
  answer: ThreadAnswer | 'TIMED_OUT',
): Promise<boolean> {
  if (answer === 'TIMED_OUT') {
    const detail = `The computation took longer than ${deps.timeoutS} s and was ended.`;
    return deps.store.refuseComputation(id, attempt, problemOf('COMPUTATION_TIMED_OUT', detail));
  }
  if (answer.outcome === 'REFUSED')
    return deps.store.refuseComputation(id, attempt, problemOfRefusal(answer.details));
  if (answer.outcome === 'NOT_CONVERGED') {
    deps.logger.error({ computation: id, attempt, detail: answer.detail }, 'an iteration did not converge');
    const detail = `An iteration of the computation reached its limit: ${answer.detail}. It was not the specification that was refused; the same request will end the same way, a changed one may not. Tell the operator.`;
    return deps.store.refuseComputation(id, attempt, problemOf('COMPUTATION_CRASHED', detail));
  }
  return deps.store.finishComputation(id, attempt, answer.design, answer.resultHash);
}
