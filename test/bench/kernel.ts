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
import type { BenchRow } from './row.ts';

const POINTS = 4001;
const ROUNDS = 2000;
const K = [0.3, 0.4, 0.5, 0.6, 0.3, 0.4, 0.5, 0.6];
const PHASES = [-1, -0.5, 0, 0.5, -1, -0.5, 0, 0.5];
const ARM_PHASES = [0.2, 1.2] as const;
/** Sums over 4,001 fields of order 1, each right to some 1e-15. */
const SAME_SUM = 1e-8;

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

function timeKernel(lossDb: number, plain: boolean): Timing {
  const kernel = plain
    ? createKernel(benchCircuit(lossDb), createPlainBlocks())
    : createKernel(benchCircuit(lossDb));
  const omega = Float64Array.from({ length: POINTS }, (_, i) => -Math.PI + (2 * Math.PI * i) / (POINTS - 1));
  const out = createFieldBuffers(POINTS);
  const times: number[] = [];
  // the first tenth warms the compiler up
  for (let round = -ROUNDS / 10; round < ROUNDS; round++) {
    const start = performance.now();
    evaluateInto(kernel, omega, out);
    if (round >= 0) times.push(1e3 * (performance.now() - start));
  }
  times.sort((a, b) => a - b);
  const sums = [out.out1Re, out.out1Im, out.out2Re, out.out2Im].map((part) =>
    part.reduce((sum, x) => sum + x, 0),
  );
  return { least: times[0]!, median: times[ROUNDS / 2]!, sums };
}

const here = (file: string) => fileURLToPath(new URL(file, import.meta.url));
const peerArguments = [ROUNDS, POINTS, ...ARM_PHASES, K.length, ...K, ...PHASES].map(String);

function parse(numbers: readonly string[]): Timing {
  const [least, median, ...sums] = numbers.map(Number);
  return { least: least!, median: median!, sums };
}

/** NumPy as it picks its own code for this processor. */
function timeNumPy(): ReadonlyMap<string, Timing> {
  const { OPENBLAS_CORETYPE, OPENBLAS_L2_SIZE, ...env } = process.env;
  try {
    const text = execFileSync('python3', [here('kernel.py'), ...peerArguments], {
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

function timeC(flags: readonly string[]): Timing | null {
  const folder = mkdtempSync(join(tmpdir(), 'kernel-'));
  try {
    const program = join(folder, 'kernel');
    execFileSync('gcc', [...flags, here('kernel.c'), '-o', program, '-lm'], { stdio: 'pipe' });
    return parse(execFileSync(program, peerArguments, { encoding: 'utf8' }).trim().split(' '));
  } catch {
    return null;
  } finally {
    rmSync(folder, { recursive: true, force: true });
  }
}

function row(ours: Timing, peer: Timing, peerName: string, note: string): BenchRow {
  const same =
    peer.sums.length === 4 && peer.sums.every((sum, i) => Math.abs(sum - ours.sums[i]!) < SAME_SUM);
  if (!same)
    throw new Error(`${peerName} computes something else: ${peer.sums.join(' ')} for ${ours.sums.join(' ')}`);
  const medians = `medians ${ours.median.toFixed(0)} and ${peer.median.toFixed(0)} µs`;
  return {
    name: 'response kernel, 8 rings × 4,001 points',
    ours: ours.least,
    peer: peer.least,
    peerName,
    unit: 'µs',
    ratio: peer.least / ours.least,
    note: note === '' ? medians : `${note}; ${medians}`,
  };
}

/** Rows for every peer that is there. Takes some ten seconds; least of many runs, medians in the note. */
export async function benchKernel(): Promise<BenchRow[]> {
  const ours = timeKernel(0, false);
  const rows = [...timeNumPy()].map(([name, timing]) =>
    row(ours, timing, `NumPy, ${name.replaceAll('_', ' ')}`, ''),
  );
  const compilers: readonly (readonly [string, readonly string[]])[] = [
    ['C, scalar', ['-O2', '-fno-tree-vectorize']],
    ['C, 128-bit SIMD', ['-O3', '-ffast-math']],
    ['C, -march=native', ['-O3', '-ffast-math', '-march=native']],
  ];
  for (const [name, flags] of compilers) {
    const timing = timeC(flags);
    if (timing !== null) rows.push(row(ours, timing, name, `gcc ${flags.join(' ')}`));
  }
  rows.push(
    row(ours, timeKernel(0, true), 'the plain typed-array loop', 'same formulas without WebAssembly'),
  );
  const lossy = timeKernel(0.2, false);
  rows.push(row(lossy, timeKernel(0.2, true), 'the plain typed-array loop', 'with loss'));
  return rows;
}
