/**
 * The response kernel against the same computation in NumPy and in C, in one run: 8 lossless rings on two arms, 4,001
 * frequencies, both outputs as complex fields. A peer that this machine does not have gives no row.
 */
import { execFileSync } from 'node:child_process';
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { createPlainBlocks } from '../../src/circuit/blocks.ts';
import {
  type CircuitParameters,
  createFieldBuffers,
  createKernel,
  evaluateInto,
} from '../../src/circuit/index.ts';
import type { BenchRow, Effort, Topic } from './row.ts';
import { median } from './statistics.ts';

const POINTS = 4001;
const K = [0.3, 0.4, 0.5, 0.6, 0.3, 0.4, 0.5, 0.6];
const PHASES = [-1, -0.5, 0, 0.5, -1, -0.5, 0, 0.5];
const ARM_PHASES = [0.2, 1.2] as const;
/** Sums over 4,001 fields of order 1, each right to some 1e-15. */
const SAME_SUM = 1e-8;
const LOSS_DB = 0.2;

interface Timing {
  readonly least: number;
  readonly median: number;
  /** Sums of out1 re, im, out2 re, im: that the peers computed the same. */
  readonly sums: readonly number[];
}

function benchCircuit(lossDb: number): CircuitParameters {
  const arm = (index: 0 | 1) => ({
    rings: K.slice(4 * index, 4 * index + 4).map((powerCrossCoupling, i) => ({
      powerCrossCoupling,
      phaseRad: PHASES[4 * index + i]!,
      lossDb,
      delay: 1,
    })),
    delay: 0,
    phaseRad: ARM_PHASES[index],
    lossDb: 0,
  });
  const cell = {
    inputCoupling: 0.5,
    outputCoupling: 0.5,
    couplerExcessLossDb: 0,
    arms: [arm(0), arm(1)] as const,
  };
  return { cells: [cell], join: 'OUT1' };
}

function timeKernel(lossDb: number, plain: boolean, rounds: number): Timing {
  const kernel = plain
    ? createKernel(benchCircuit(lossDb), createPlainBlocks())
    : createKernel(benchCircuit(lossDb));
  const omega = Float64Array.from({ length: POINTS }, (_, i) => -Math.PI + (2 * Math.PI * i) / (POINTS - 1));
  const out = createFieldBuffers(POINTS);
  const times: number[] = [];
  // the first tenth warms the compiler up
  for (let round = -rounds / 10; round < rounds; round++) {
    const start = performance.now();
    evaluateInto(kernel, omega, out);
    if (round >= 0) times.push(1e3 * (performance.now() - start));
  }
  times.sort((a, b) => a - b);
  const sums = [out.out1Re, out.out1Im, out.out2Re, out.out2Im].map((part) =>
    part.reduce((sum, x) => sum + x, 0),
  );
  return { least: times[0]!, median: median(times), sums };
}

const here = (file: string) => fileURLToPath(new URL(file, import.meta.url));
const peerArguments = (rounds: number): string[] =>
  [rounds, POINTS, ...ARM_PHASES, K.length, ...K, ...PHASES].map(String);

function parse(numbers: readonly string[]): Timing {
  const [least, median, ...sums] = numbers.map(Number);
  return { least: least!, median: median!, sums };
}

/** NumPy as it picks its own code for this processor. */
function timeNumPy(rounds: number): ReadonlyMap<string, Timing> {
  const { OPENBLAS_CORETYPE, OPENBLAS_L2_SIZE, ...env } = process.env;
  try {
    const text = execFileSync('python3', [here('kernel.py'), ...peerArguments(rounds)], {
      encoding: 'utf8',
      env,
      stdio: 'pipe',
    });
    return new Map(
      text
        .trim()
        .split('\n')
        .map((line) => line.split(' '))
        .map(([name, ...numbers]) => [name!, parse(numbers)]),
    );
  } catch {
    return new Map();
  }
}

interface Program {
  readonly name: string;
  readonly flags: string;
  readonly file: string;
}

const COMPILERS: readonly (readonly [string, readonly string[]])[] = [
  ['C, scalar', ['-O2', '-fno-tree-vectorize']],
  ['C, 128-bit SIMD', ['-O3', '-ffast-math']],
  ['C, -march=native', ['-O3', '-ffast-math', '-march=native']],
];

/** Every way of compiling that works here. */
function compileC(folder: string): Program[] {
  return COMPILERS.flatMap(([name, flags], index) => {
    const file = join(folder, `kernel${index}`);
    try {
      execFileSync('gcc', [...flags, here('kernel.c'), '-o', file, '-lm'], { stdio: 'pipe' });
      return [{ name, flags: flags.join(' '), file }];
    } catch {
      return [];
    }
  });
}

const timeC = ({ file }: Program, rounds: number): Timing =>
  parse(execFileSync(file, peerArguments(rounds), { encoding: 'utf8' }).trim().split(' '));

/** One side of a row, and how it is timed once. */
interface Side {
  readonly name: string;
  readonly note: string;
  readonly timings: Timing[];
}

/** The least of all; the median of the runs' medians. */
function together({ name, timings }: Side): Timing {
  const sums = timings[0]?.sums;
  if (sums === undefined) throw new Error(`${name} was not timed`);
  return {
    least: Math.min(...timings.map((timing) => timing.least)),
    median: median(timings.map((timing) => timing.median)),
    sums,
  };
}

function row(ours: Timing, side: Side): BenchRow {
  const peer = together(side);
  const same =
    peer.sums.length === 4 && peer.sums.every((sum, i) => Math.abs(sum - ours.sums[i]!) < SAME_SUM);
  if (!same)
    throw new Error(
      `${side.name} computes something else: ${peer.sums.join(' ')} for ${ours.sums.join(' ')}`,
    );
  const medians = `medians ${ours.median.toFixed(0)} and ${peer.median.toFixed(0)} µs`;
  return {
    name: 'response kernel',
    ours: ours.least,
    peer: peer.least,
    peerName: side.name,
    unit: 'µs',
    ratio: peer.least / ours.least,
    note: side.note === '' ? medians : `${side.note}; ${medians}`,
  };
}

function sideNamed(sides: Map<string, Side>, name: string, note: string): Side {
  const side = sides.get(name) ?? { name, note, timings: [] };
  sides.set(name, side);
  return side;
}

const PLAIN = 'the plain typed-array loop';

/** Ours and every peer that is there take turns. Some ten seconds, quick one; least of all rounds, medians in the note. */
export async function benchKernel({ quick }: Effort): Promise<Topic> {
  const [turns, rounds] = quick ? [2, 100] : [5, 500];
  const sides = new Map<string, Side>();
  const ours = sideNamed(new Map(), 'ours', '');
  const lossy = sideNamed(new Map(), 'ours with loss', '');
  const plainLossy = sideNamed(new Map(), PLAIN, 'with loss');
  const folder = mkdtempSync(join(tmpdir(), 'kernel-'));
  let programs: readonly Program[] = [];
  let hasNumPy = false;
  try {
    programs = compileC(folder);
    for (let turn = 0; turn < turns; turn++) {
      ours.timings.push(timeKernel(0, false, rounds));
      for (const [form, timing] of timeNumPy(rounds)) {
        hasNumPy = true;
        sideNamed(sides, `NumPy, ${form.replaceAll('_', ' ')}`, '').timings.push(timing);
      }
      for (const program of programs)
        sideNamed(sides, program.name, `gcc ${program.flags}`).timings.push(timeC(program, rounds));
      sideNamed(sides, PLAIN, 'same formulas without WebAssembly').timings.push(timeKernel(0, true, rounds));
      lossy.timings.push(timeKernel(LOSS_DB, false, rounds));
      plainLossy.timings.push(timeKernel(LOSS_DB, true, rounds));
    }
  } finally {
    rmSync(folder, { recursive: true, force: true });
  }
  const mine = together(ours);
  return {
    title: 'Response kernel, 8 rings × 4,001 points, both outputs; least time',
    rows: [...[...sides.values()].map((side) => row(mine, side)), row(together(lossy), plainLossy)],
    missing: [...(hasNumPy ? [] : ['python3 with NumPy']), ...(programs.length > 0 ? [] : ['gcc'])],
  };
}
