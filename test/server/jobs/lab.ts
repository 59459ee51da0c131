/** An invented lab on a database of its own: a chip, somebody who asks, and worker processes. */
import { type ChildProcess, spawn } from 'node:child_process';
import { createHash, randomBytes } from 'node:crypto';
import { once } from 'node:events';
import { setTimeout as sleep } from 'node:timers/promises';
import { canonicalJson } from '../../../schema/jcs.ts';
import { createStore, type RequestRecord, type Store, type Submitted } from '../../../server/store/index.ts';
import { ENGINE_VERSION } from '../../../src/conventions.ts';
import type { FilterSpecification } from '../../../src/filter/index.ts';
import { inventedChip } from '../rest/invented-chips.ts';

const sha256 = (text: string): string => createHash('sha256').update(text).digest('hex');

/** Long enough for a busy machine with two cores; nothing is asserted about speed by it. */
const PATIENCE_MS = 30_000;

export interface WorkerProcess {
  readonly child: ChildProcess;
  /** Everything it logged. */
  readonly log: () => string;
  kill(signal: NodeJS.Signals): Promise<void>;
}

export interface Lab {
  readonly store: Store;
  ask(specification: FilterSpecification): Promise<Submitted>;
  /** Asks for something that nobody asked for before, by its own label; the record of a queued request. */
  askNew(label?: string): Promise<RequestRecord>;
  cancel(request: RequestRecord): Promise<void>;
  waitFor(id: string, until: (request: RequestRecord) => boolean): Promise<RequestRecord>;
  startWorker(environment?: Readonly<Record<string, string>>): Promise<WorkerProcess>;
  close(): Promise<void>;
}

const isFinal = ({ state }: RequestRecord): boolean => !['QUEUED', 'RUNNING'].includes(state);

export { isFinal };

/** A fourth-order elliptic half-band filter as a mask, which the invented chip can do; `label` makes it another question. */
function maskOf(label: string): FilterSpecification {
  return {
    mask: {
      reference: 'PEAK',
      family: 'ELLIPTIC',
      bands: [
        { lowGhz: -11, highGhz: 11, minTransmissionDb: -3, output: 'OUT2', label },
        { lowGhz: 18, highGhz: 32, maxTransmissionDb: -20, output: 'OUT2' },
      ],
    },
  };
}

async function startProcess(
  url: string,
  environment: Readonly<Record<string, string>>,
): Promise<WorkerProcess> {
  const child = spawn(
    process.execPath,
    ['--import', 'tsx', new URL('./worker-process.ts', import.meta.url).pathname],
    { env: { ...process.env, DATABASE_URL: url, ...environment }, stdio: ['ignore', 'pipe', 'pipe'] },
  );
  let log = '';
  const collect = (chunk: Buffer): void => {
    log += chunk.toString();
  };
  child.stdout.on('data', collect);
  child.stderr.on('data', collect);
  const exited = once(child, 'exit');
  for (const until = Date.now() + PATIENCE_MS; !log.includes('READY'); await sleep(20))
    if (Date.now() > until || child.exitCode !== null) throw new Error(`the worker did not start:\n${log}`);
  return {
    child,
    log: () => log,
    async kill(signal) {
      child.kill(signal);
      await exited;
    },
  };
}

export async function openLab(url: string): Promise<Lab> {
  const store = await createStore({ databaseUrl: url });
  const lookup = 'abcdefgh0123';
  await store.bootstrapAdmin({ lookup, secretHash: randomBytes(32) });
  const token = (await store.findToken(lookup))!;
  const by = { actorId: token.actor.id, tokenId: token.id };
  const model = inventedChip();
  const revisionText = canonicalJson({ kind: 'chipRevision', schema: 1, serial: 'X-01', number: 1, model });
  await store.registerChip(by, {
    serial: 'X-01',
    description: 'invented',
    model,
    canonical: revisionText,
    hash: sha256(revisionText),
  });
  const chip = (await store.findChip('X-01'))!;
  const revision = (await store.findRevision(chip.id, 1))!;
  const processes: WorkerProcess[] = [];
  const ask = (specification: FilterSpecification): Promise<Submitted> => {
    const canonical = canonicalJson({
      ...{ kind: 'design', schema: 1, engine: ENGINE_VERSION, chipRevision: revision.hash },
      ...{ specification, synthesis: {} },
    });
    return store.submitRequest(
      by,
      {
        ...{ chipId: chip.id, chipRevisionId: revision.id, asked: { specification }, canonical },
        ...{ key: sha256(canonical), engine: ENGINE_VERSION },
      },
      { openPerToken: 1000, queue: 1000 },
    );
  };
  return {
    store,
    ask,
    async askNew(label = randomBytes(6).toString('hex')) {
      const submitted = await ask(maskOf(label));
      if (submitted.outcome !== 'WRITTEN') throw new Error(`not queued: ${submitted.outcome}`);
      return submitted.record;
    },
    async cancel({ id }) {
      const outcome = await store.cancelRequest(by, id);
      if (outcome.outcome !== 'WRITTEN') throw new Error(outcome.outcome);
    },
    async waitFor(id, until) {
      for (const end = Date.now() + PATIENCE_MS; ; await sleep(20)) {
        const request = await store.findRequest(id);
        if (request !== null && until(request)) return request;
        if (Date.now() > end) throw new Error(`waited in vain: ${JSON.stringify(request)}`);
      }
    },
    async startWorker(environment = {}) {
      const started = await startProcess(url, environment);
      processes.push(started);
      return started;
    },
    async close() {
      await Promise.all(
        processes.map(({ child, kill }) =>
          child.exitCode === null && child.signalCode === null ? kill('SIGKILL') : null,
        ),
      );
      await store.close();
    },
  };
}
