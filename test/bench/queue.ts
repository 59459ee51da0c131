/**
 * From the request for a design that nobody asked for before to its answer, over HTTP with `Prefer: wait`, less what the
 * computation itself takes. That is measured in this process, warm, where it is the fastest: the rest is never too small.
 */
import { chipModelOf } from '../../schema/chip.ts';
import { computeDesign } from '../../src/design/index.ts';
import { inventedChip } from '../server/rest/invented-chips.ts';
import type { BenchRow, Effort, Topic } from './row.ts';
import { requestBody, type Services } from './services.ts';
import { median, quantile } from './statistics.ts';

/** What is aimed at, ms at the median. */
const AIM_MS = 15;
const WARM_UP = 10;
/** Between two requests, ms: each meets an idle queue. */
const PAUSE_MS = 20;

/** An edge of its own for every request, GHz. */
const edgeOf = (index: number): number => 8 + 0.01 * index;

const chip = chipModelOf(inventedChip());

function computationMs(edgeGhz: number, order: number): number {
  const start = performance.now();
  computeDesign(
    {
      specification: {
        family: {
          ...({ family: 'ELLIPTIC', shape: 'LOW_PASS', output: 'OUT2' } as const),
          ...{ order, centreGhz: 0, rippleDb: 2, rejectionDb: 40 },
          band: { lowGhz: -edgeGhz, highGhz: edgeGhz },
        },
      },
      synthesis: {},
    },
    chip,
  );
  return performance.now() - start;
}

export async function benchQueue(services: Services, { quick }: Effort): Promise<Topic> {
  const requests = quick ? 50 : 200;
  const whole: number[] = [];
  const overhead: number[] = [];
  for (let index = 0; index < WARM_UP + requests; index++) {
    const [edgeGhz, order] = [edgeOf(index), 2 + (index % 3)] as const;
    const start = performance.now();
    const answer = await services.call(
      '/v1/design-requests',
      'POST',
      requestBody(services.chip, edgeGhz, order),
      { prefer: 'wait=30' },
    );
    const ms = performance.now() - start;
    if (answer.status !== 200) throw new Error(`design ${index}: ${answer.status} ${answer.text}`);
    if (index < WARM_UP) {
      computationMs(edgeGhz, order);
      continue;
    }
    whole.push(ms);
    overhead.push(ms - Math.min(computationMs(edgeGhz, order), computationMs(edgeGhz, order)));
    await new Promise((resolve) => setTimeout(resolve, PAUSE_MS));
  }
  const row = (name: string, ours: number): BenchRow => ({
    ...{ name, ours, peer: AIM_MS, peerName: 'the aim at the median', unit: 'ms', ratio: AIM_MS / ours },
    note: `${requests} designs; ${median(whole).toFixed(1)} ms with the computation at the median`,
  });
  return {
    title: 'From request to finished design through the queue, less the computation',
    rows: [row('median', median(overhead)), row('95 %', quantile(overhead, 0.95))],
    missing: [],
  };
}
