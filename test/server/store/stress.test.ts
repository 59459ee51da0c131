import { setTimeout as sleep } from 'node:timers/promises';
import { expect, it } from 'vitest';
import { createStore } from '../../../server/store/index.ts';
import { inventedDesign, LIMITS, makeChip, openLibrary, questionOf, sha256 } from '../../support/library.ts';

/** Long enough for every race to happen many times (the counts below are checked), short enough for every run. */
const DURATION_MS = 4000;
/** A slow machine gets longer to see each kind. */
const PATIENCE_MS = 20_000;
/** A new question after so many written asks, and a few of the last ones asked for at a time: hits, joins and misses all happen, at any speed of the machine. */
const ASKS_A_QUESTION = 8;
const SPREAD = 8;
/** Of every kind of outcome; a slow machine has hundreds of the common ones and some of the rare. */
const LEAST_OF_EACH = 3;

/** A small generator with a seed, so that runs differ only by their timing. */
function generator(seed: number): () => number {
  let state = seed;
  return () => {
    state = (Math.imul(state, 1664525) + 1013904223) >>> 0;
    return state / 2 ** 32;
  };
}

it('asking, cancelling, computing and dying at once: nothing stuck, nothing computed twice, every count right', async () => {
  const library = await openLibrary();
  const crowded = await createStore({ databaseUrl: library.database.url, poolSize: 24 });
  const on = await makeChip(library, 'stress');
  const random = generator(7);
  const open: string[] = [];
  const tally = { hit: 0, written: 0, cancelled: 0, finished: 0, fenced: 0, abandoned: 0 };
  const begun = Date.now();
  const isRare = ([, count]: [string, number]) => count < LEAST_OF_EACH;
  const isOver = () => {
    const elapsed = Date.now() - begun;
    return elapsed > PATIENCE_MS || (elapsed > DURATION_MS && !Object.entries(tally).some(isRare));
  };
  const limits = { ...LIMITS, openPerToken: 100_000 };

  const asker = async (): Promise<void> => {
    while (!isOver()) {
      const newest = Math.floor(tally.written / ASKS_A_QUESTION);
      const ask = questionOf(on, `stress-${newest + Math.floor(random() * SPREAD)}`);
      const keyed =
        random() < 0.2 ? { key: `k${random()}`, operation: 'requestDesign', fingerprint: 'f' } : undefined;
      const answer = await crowded.submitRequest(library.by, ask, limits, keyed);
      if (answer.outcome === 'DESIGN') tally.hit++;
      if (answer.outcome === 'WRITTEN') {
        tally.written++;
        open.push(answer.record.id);
      }
    }
  };
  const canceller = async (): Promise<void> => {
    while (!isOver()) {
      const [id] = open.splice(Math.floor(random() * open.length), 1);
      if (id === undefined) await sleep(2);
      else if ((await crowded.cancelRequest(library.by, id)).outcome === 'WRITTEN') tally.cancelled++;
    }
  };
  const computeOne = async (dies: boolean): Promise<boolean> => {
    const [next] = await library.query<{ id: string }>(
      "select id from computation where state in ('QUEUED','RUNNING') order by random() limit 1",
    );
    if (!next) return false;
    const started = await crowded.startComputation(next.id);
    if (!started) return true;
    await sleep(random() * 8);
    if (dies) tally.abandoned++;
    else if (
      await crowded.finishComputation(started.id, started.attempt, inventedDesign(), sha256(started.key))
    )
      tally.finished++;
    else tally.fenced++;
    return true;
  };
  const worker = async (): Promise<void> => {
    while (!isOver()) if (!(await computeOne(random() < 0.1))) await sleep(1);
  };

  await Promise.all([
    ...Array.from({ length: 12 }, asker),
    ...Array.from({ length: 5 }, canceller),
    ...Array.from({ length: 4 }, worker),
  ]);
  const wrongWaiters = await library.query(
    `select c.id from computation c where c.state in ('QUEUED','RUNNING') and c.waiters <>
       (select count(*) from request r where r.computation_id = c.id and r.state in ('QUEUED','RUNNING'))`,
  );
  expect(wrongWaiters).toEqual([]);
  while (await computeOne(false));
  const stuck = await library.query("select id from request where state in ('QUEUED','RUNNING')");
  const twice = await library.query(
    "select key from computation where state = 'DONE' group by key having count(*) > 1",
  );
  const jobsLeft = await library.query(
    `select j.key from graphile_worker.jobs j join computation c on c.id::text = j.key where c.state = 'CANCELLED'`,
  );
  const unanswered = await library.query(
    "select id from request where state = 'DONE' and design_id is distinct from key",
  );
  expect({ stuck, twice, jobsLeft, unanswered }).toEqual({
    stuck: [],
    twice: [],
    jobsLeft: [],
    unanswered: [],
  });
  expect(Object.entries(tally).filter(isRare)).toEqual([]);
  await crowded.close();
  await library.close();
});
