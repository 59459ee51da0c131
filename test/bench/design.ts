/**
 * A whole uncached design against SciPy on the same grid: the fourth-order elliptic half-band, 2 dB and 40 dB. The
 * like-for-like rows do what SciPy does (zeros and poles, second-order sections, the field of the filter at 4,001
 * points); the other one is everything that a design of ours is: plan, circuit, placement, setting of every channel,
 * figures, compliance, and the curve of the setting with delay and dispersion.
 */
import { spawn } from 'node:child_process';
import { createInterface } from 'node:readline';
import { fileURLToPath } from 'node:url';
import { chipModelOf } from '../../schema/chip.ts';
import { computeDesign, curveOf, type DesignQuestion } from '../../src/design/index.ts';
import {
  designLowPass,
  evaluateInto,
  leastOrder,
  pairPoles,
  reachableStopEdgeRad,
  toSections,
} from '../../src/filter/index.ts';
import { inventedChip } from '../server/rest/invented-chips.ts';
import type { BenchRow, Effort, Topic } from './row.ts';
import { least, median } from './statistics.ts';

const POINTS = 4001;
const RIPPLE_DB = 2;
const REJECTION_DB = 40;
const EDGE_RAD = Math.PI / 2;
/** A tenth of a per mille beyond the natural stopband edge, so that rounding on neither side asks for order 5. */
const STOP_RAD =
  1.0001 *
  reachableStopEdgeRad('ELLIPTIC', 4, {
    passEdgeRad: EDGE_RAD,
    rippleDb: RIPPLE_DB,
    rejectionDb: REJECTION_DB,
  });

const demand = {
  passEdgeRad: EDGE_RAD,
  stopEdgeRad: STOP_RAD,
  rippleDb: RIPPLE_DB,
  rejectionDb: REJECTION_DB,
};
const omega = Float64Array.from({ length: POINTS }, (_, i) => -Math.PI + (2 * Math.PI * i) / (POINTS - 1));

interface Field {
  readonly re: Float64Array;
  readonly im: Float64Array;
}

function filterAndField(order: number): Field {
  const filter = designLowPass({
    family: 'ELLIPTIC',
    order,
    rippleDb: RIPPLE_DB,
    rejectionDb: REJECTION_DB,
    edgeRad: EDGE_RAD,
  });
  const sections = toSections(filter, pairPoles(filter));
  if (sections.length !== 2) throw new Error(`${sections.length} sections`);
  const field = { re: new Float64Array(POINTS), im: new Float64Array(POINTS) };
  evaluateInto(filter, omega, field.re, field.im);
  return field;
}

const chip = chipModelOf(inventedChip());
const offsetGhz = omega.map((angle) => (angle * chip.fsrGhz) / (2 * Math.PI));
const question: DesignQuestion = {
  specification: {
    family: {
      family: 'ELLIPTIC',
      shape: 'LOW_PASS',
      order: 4,
      centreGhz: 0,
      band: { lowGhz: -chip.fsrGhz / 4, highGhz: chip.fsrGhz / 4 },
      rippleDb: RIPPLE_DB,
      rejectionDb: REJECTION_DB,
      output: 'OUT2',
    },
  },
  synthesis: {},
};

function wholeDesign(): Field {
  const design = computeDesign(question, chip);
  return curveOf(design, chip, 'SETTING', design.output, offsetGhz).spectrum;
}

/** Σ|H|² and Σ|H|²·i/points. */
function sumsOf({ re, im }: Field): [number, number] {
  let sum = 0;
  let weighted = 0;
  for (let i = 0; i < POINTS; i++) {
    const power = re[i]! ** 2 + im[i]! ** 2;
    sum += power;
    weighted += (power * i) / POINTS;
  }
  return [sum, weighted];
}

interface Batch {
  readonly times: readonly number[];
  readonly sums: readonly number[];
}

function timeBatch(work: () => Field, rounds: number): Batch {
  const times: number[] = [];
  let field = work();
  for (let round = 0; round < rounds; round++) {
    const start = performance.now();
    field = work();
    times.push(1e3 * (performance.now() - start));
  }
  return { times, sums: sumsOf(field) };
}

interface SciPy {
  time(form: 'ellip' | 'iirdesign', rounds: number): Promise<Batch>;
  stop(): void;
}

/** A Python that stays up, so that batches can take turns with ours. Null: none, or without SciPy. */
async function startSciPy(): Promise<SciPy | null> {
  const file = fileURLToPath(new URL('design.py', import.meta.url));
  const figures = [POINTS, RIPPLE_DB, REJECTION_DB, EDGE_RAD / Math.PI, STOP_RAD / Math.PI].map(String);
  const python = spawn('python3', [file, ...figures], { stdio: ['pipe', 'pipe', 'ignore'] });
  python.on('error', () => {});
  python.stdin.on('error', () => {});
  const lines = createInterface({ input: python.stdout })[Symbol.asyncIterator]();
  if ((await lines.next()).value !== 'ready') return null;
  return {
    async time(form, rounds) {
      python.stdin.write(`${form} ${rounds}\n`);
      return JSON.parse(String((await lines.next()).value)) as Batch;
    },
    stop: () => python.stdin.end(),
  };
}

/** 4,001 terms up to 1, each right to 1e-12 on both sides. */
const SAME_SUM = 1e-6;

function refuseDifferent(ours: Batch, peer: Batch, peerName: string): void {
  if (peer.sums.length === 2 && peer.sums.every((sum, i) => Math.abs(sum - ours.sums[i]!) < SAME_SUM)) return;
  throw new Error(`${peerName} computes something else: ${peer.sums.join(' ')} for ${ours.sums.join(' ')}`);
}

function rowOf(name: string, ours: readonly number[], peer: readonly number[], peerName: string): BenchRow {
  return {
    name,
    ours: median(ours),
    peer: median(peer),
    peerName,
    unit: 'µs',
    ratio: median(peer) / median(ours),
    note: `least ${least(ours).toFixed(0)} and ${least(peer).toFixed(0)} µs`,
  };
}

/** Batches of ours and of SciPy take turns; medians over all of them. Twenty seconds, quick two. */
export async function benchDesign({ quick }: Effort): Promise<Topic> {
  const title = 'A design that nobody asked for before (fourth-order elliptic half-band, 4,001 points)';
  const sciPy = await startSciPy();
  if (sciPy === null) return { title, rows: [], missing: ['python3 with SciPy'] };
  const [turns, rounds] = quick ? [2, 20] : [20, 100];
  const cases = [
    {
      name: 'zeros, poles, sections, field; order given',
      work: () => filterAndField(4),
      form: 'ellip',
      same: true,
    },
    {
      name: 'zeros, poles, sections, field; order found',
      work: () => filterAndField(leastOrder('ELLIPTIC', demand).order),
      form: 'iirdesign',
      same: false,
    },
    {
      name: 'the whole design with circuit, setting and figures',
      work: wholeDesign,
      form: 'iirdesign',
      same: false,
    },
  ] as const;
  try {
    const rows: BenchRow[] = [];
    for (const { name, work, form, same } of cases) {
      const peerName = `SciPy ${form} + sosfreqz`;
      timeBatch(work, rounds);
      await sciPy.time(form, rounds);
      const ours: number[] = [];
      const peer: number[] = [];
      for (let turn = 0; turn < turns; turn++) {
        const one = timeBatch(work, rounds);
        const other = await sciPy.time(form, rounds);
        if (same) refuseDifferent(one, other, peerName);
        ours.push(...one.times);
        peer.push(...other.times);
      }
      rows.push(rowOf(name, ours, peer, peerName));
    }
    return { title, rows, missing: [] };
  } finally {
    sciPy.stop();
  }
}
