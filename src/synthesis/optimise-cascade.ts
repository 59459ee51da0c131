/**
 * Joint optimisation of all cells of a cascade over a mask. Exact sections pay for their passivity (10.5 dB for the
 * fourth-order half-band of 2 dB and 40 dB at its own stop edge); cells that need only meet the mask together pay far
 * less as soon as the stop edge may move. Zeros of a lossless balanced cell stay where its two arms can cancel.
 *
 * Screening of all starts by their merit, then rounds of the minimax method (src/optimise) in which ever fewer starts get
 * ever more evaluations: successive halving, K. Jamieson and A. Talwalkar, AISTATS (2016), with fixed rounds. The best is
 * finished on a grid four times as dense. Everything is deterministic for a seed.
 */
import type { InterferometerParameters } from '../circuit/index.ts';
import type { FilterSection, OutputPort, TransferFunction } from '../filter/index.ts';
import { type MinimaxResult, minimiseMaximum } from '../optimise/index.ts';
import { createCascadeModel, ringDepth } from './cascade-model.ts';
import { type CascadeStart, cascadeStarts } from './cascade-starts.ts';
import { type CellLosses, withLosses } from './interferometer.ts';
import {
  brightest,
  type CascadeGoal,
  type CascadeProblem,
  type MaskGrid,
  maskGrid,
  maskProblem,
  type OmegaMask,
  worstMiss,
} from './mask-problem.ts';
import { sectionOf } from './section.ts';
import { type CascadeCell, needsOutputs } from './section-cascade.ts';

export interface CascadeOptions {
  readonly goal: CascadeGoal;
  /** BALANCED: K_in = K_out = 0.5. FREE: both free; they balance arms of unequal loss. */
  readonly couplers: 'BALANCED' | 'FREE';
  /** Reach of every ring's K. */
  readonly minimumCoupling: number;
  readonly maximumCoupling: number;
  readonly losses: CellLosses;
  /** Greatest insertion loss, dB; absent: none. */
  readonly maximumInsertionLossDb?: number;
  readonly seed: number;
  /** Further starts, such as the solution of a neighbouring mask. */
  readonly startingCells?: readonly (readonly InterferometerParameters[])[];
  /** Progress in [0, 1], never falling; throw from here to cancel. */
  readonly onProgress?: (share: number) => void;
}

export const CASCADE_DEFAULTS: CascadeOptions = {
  goal: 'LEAST_LOSS',
  couplers: 'BALANCED',
  minimumCoupling: 1e-3,
  maximumCoupling: 1,
  losses: { ringLossDb: 0, couplerExcessLossDb: 0 },
  seed: 1,
};

export interface OptimisedCascade {
  /** Cells with their exact zeros, poles and gain, losses included. */
  readonly cells: readonly CascadeCell[];
  /** Demands kept within 0.01 dB on a grid four times denser than the optimiser's. */
  readonly met: boolean;
  /** Worst margin over all demands, dB; negative where the mask is missed. */
  readonly worstMarginDb: number;
  readonly stopbandMarginDb: number;
  /** −(greatest transmission in the passband), dB. */
  readonly insertionLossDb: number;
  readonly rippleDb: number;
  readonly starts: number;
  readonly evaluations: number;
  /** What was tried and reached, in one sentence. */
  readonly reason: string;
}

/** Starts kept after each round, and evaluations each of them gets in it. */
const ROUNDS: readonly { readonly kept: number; readonly evaluations: number }[] = [
  { kept: 48, evaluations: 20 },
  { kept: 10, evaluations: 40 },
  { kept: 3, evaluations: 150 },
];
const FINISHING_DENSITY = 4;
const FINISHING_EVALUATIONS = 80;

/** dB per dB of violation. Ten is too little: near its cliff the half-band trades 7 dB of loss for 0.6 dB of ripple. */
const PENALTY = 100;
/** Deep nulls are left out of a step's model: their dB are far from linear, and far from leading. */
const WINDOW_DB = 25;
const GAIN_TOLERANCE_DB = 1e-5;
const INITIAL_DAMPING = 10;
/** A demand missed by less than this is kept: below what a lab can measure. */
const KEPT_DB = 0.01;
/** Nothing passive does better than no loss; stop within this of it. */
const LOSSLESS_DB = 1e-3;

interface Task {
  readonly outputs: readonly OutputPort[];
  readonly mask: OmegaMask;
  readonly options: CascadeOptions;
  readonly poles: number;
}

interface Bench {
  readonly problem: CascadeProblem;
  readonly grid: MaskGrid;
  readonly model: ReturnType<typeof createCascadeModel>;
}

/** Model and problem for cells of one structure (which arm holds a ring). */
function benchFor(task: Task, cells: readonly InterferometerParameters[], density: number): Bench {
  const { options, mask } = task;
  const grid = maskGrid(mask, task.poles, density);
  const free = options.couplers === 'FREE';
  const model = createCascadeModel(cells, task.outputs, grid.omegaRad, free);
  const deepest = ringDepth(options.minimumCoupling);
  const shallowest = options.maximumCoupling < 1 ? ringDepth(options.maximumCoupling) : -deepest;
  const lower = new Float64Array(model.parameters).fill(Number.NEGATIVE_INFINITY);
  const upper = new Float64Array(model.parameters).fill(Number.POSITIVE_INFINITY);
  for (const at of model.depths) {
    lower[at] = shallowest;
    upper[at] = deepest;
  }
  const limits = { lower, upper };
  const problem = maskProblem(model, grid, mask, options.goal, options.maximumInsertionLossDb, limits);
  return { problem, grid, model };
}

interface Run {
  readonly pairing: number;
  readonly bench: Bench;
  readonly x: Float64Array;
  readonly merit: number;
}

const meritOf = (result: Pick<MinimaxResult, 'value' | 'violation'>): number =>
  result.value + PENALTY * Math.max(0, result.violation);

function clampInto(problem: CascadeProblem, x: Float64Array): Float64Array {
  return x.map((value, k) => Math.min(problem.upper![k]!, Math.max(problem.lower![k]!, value)));
}

/** Judges a start without moving it. */
function judge(bench: Bench, pairing: number, cells: readonly InterferometerParameters[]): Run {
  const { problem } = bench;
  const packed = problem.startOf(bench.model.pack(cells));
  const x = problem.startOf(problem.parametersOf(clampInto(problem, packed)));
  const values = new Float64Array(problem.objectives + problem.constraints);
  problem.evaluateInto(x, values, null);
  const value = values.subarray(0, problem.objectives).reduce((a, b) => Math.max(a, b));
  const violation = values.subarray(problem.objectives).reduce((a, b) => Math.max(a, b), Number.NEGATIVE_INFINITY);
  return { pairing, bench, x, merit: meritOf({ value, violation }) };
}

/** The best of every pairing first, then the best of all, so that no pairing is lost to a poor first guess. */
function shortlist(runs: readonly Run[], kept: number): Run[] {
  const sorted = [...runs].sort((a, b) => a.merit - b.merit);
  const seen = new Set<number>();
  const leaders = sorted.filter(({ pairing }) => !seen.has(pairing) && seen.add(pairing)).slice(0, kept / 2);
  const others = sorted.filter((run) => !leaders.includes(run));
  return [...leaders, ...others].slice(0, kept);
}

/** Goes on from a run for some evaluations; `tally` counts them and reports progress. */
function improve(run: Run, evaluations: number, goal: CascadeGoal, tally: (used: number) => void): Run {
  const result = minimiseMaximum(run.bench.problem, run.x, {
    penalty: PENALTY,
    window: WINDOW_DB,
    gainTolerance: GAIN_TOLERANCE_DB,
    maximumEvaluations: evaluations,
    initialDamping: INITIAL_DAMPING,
    ...(goal === 'LEAST_LOSS' ? { goodEnough: LOSSLESS_DB } : {}),
  });
  tally(result.evaluations);
  return { ...run, x: result.x, merit: meritOf(result) };
}

/** Total of the rounds for the progress report. */
function plannedEvaluations(starts: number): number {
  let left = starts;
  return ROUNDS.reduce((sum, round) => {
    left = Math.min(left, round.kept);
    return sum + left * round.evaluations;
  }, FINISHING_DENSITY * FINISHING_EVALUATIONS);
}

function report(task: Task, run: Run, starts: number, evaluations: number): OptimisedCascade {
  const { bench } = run;
  const parameters = bench.problem.parametersOf(run.x);
  const interferometers = bench.model.unpack(parameters);
  const powerDb = new Float64Array(bench.model.points);
  bench.model.evaluateInto(parameters, powerDb, null);
  const insertionLossDb = -powerDb[brightest(bench.grid, powerDb)]!;
  const least = bench.grid.passPoints.reduce((low, point) => Math.min(low, powerDb[point]!), 0);
  const lossMiss =
    task.options.maximumInsertionLossDb === undefined
      ? Number.NEGATIVE_INFINITY
      : insertionLossDb - task.options.maximumInsertionLossDb;
  const miss = Math.max(worstMiss(bench.grid, task.mask, powerDb), lossMiss);
  const met = miss <= KEPT_DB;
  return {
    cells: interferometers.map((interferometer, k) => {
      const output = task.outputs[k]!;
      const section: FilterSection = sectionOf(interferometer, output);
      return { interferometer, output, section };
    }),
    met,
    worstMarginDb: -miss,
    stopbandMarginDb: -worstMiss(bench.grid, task.mask, powerDb, 1),
    insertionLossDb,
    rippleDb: -insertionLossDb - least,
    starts,
    evaluations,
    reason: `Optimised jointly over the mask from ${starts} starts (every pairing of the poles, mirrored or not): ${insertionLossDb.toFixed(2)} dB insertion loss, ${met ? 'all demands kept' : `worst demand missed by ${miss.toFixed(2)} dB`}.`,
  };
}

function search(task: Task, starts: readonly CascadeStart[]): OptimisedCascade {
  const { goal, onProgress } = task.options;
  const benches = new Map<string, Bench>();
  const benchOf = (cells: readonly InterferometerParameters[]): Bench => {
    const structure = cells.map((cell) => cell.arms.map((arm) => arm.rings.length).join('+')).join(' ');
    const bench = benches.get(structure) ?? benchFor(task, cells, 1);
    benches.set(structure, bench);
    return bench;
  };
  const planned = plannedEvaluations(starts.length);
  let evaluations = 0;
  const tally = (used: number): void => {
    evaluations += used;
    onProgress?.(Math.min(0.99, evaluations / planned));
  };
  let runs = starts.map(({ pairing, cells }) => judge(benchOf(cells), pairing, cells));
  for (const round of ROUNDS)
    runs = shortlist(runs, round.kept).map((run) => improve(run, round.evaluations, goal, tally));
  const best = runs.reduce((a, b) => (b.merit < a.merit ? b : a));
  const cells = best.bench.model.unpack(best.bench.problem.parametersOf(best.x));
  const dense = judge(benchFor(task, cells, FINISHING_DENSITY), best.pairing, cells);
  const finished = improve(dense, FINISHING_EVALUATIONS, goal, (used) => tally(FINISHING_DENSITY * used));
  onProgress?.(1);
  return report(task, finished, starts.length, evaluations);
}

/**
 * The cascade that serves `mask` best for the goal, started from every pairing of the filter's poles. `filter`: one that
 * meets the mask by itself, or nearly; `outputs`: one a cell, ⌈order/2⌉ of them. The result is the best found, not a
 * certificate; `met` says whether the mask is kept. One to two seconds for two cells. Throws a Refusal where the number
 * of cells is wrong, RangeError for a mask without a passband.
 */
export function optimiseCascade(
  filter: TransferFunction,
  outputs: readonly OutputPort[],
  mask: OmegaMask,
  options: Partial<CascadeOptions> = {},
): OptimisedCascade {
  needsOutputs(outputs, filter.poles.length);
  const settled: CascadeOptions = { ...CASCADE_DEFAULTS, ...options };
  const task = taskOf(outputs, mask, settled, filter.poles.length);
  const lossy = (cells: readonly InterferometerParameters[]): InterferometerParameters[] =>
    cells.map((cell) => withLosses(cell, settled.losses));
  const own = cascadeStarts(filter, outputs, settled.seed).map((start) => ({
    ...start,
    cells: lossy(start.cells),
  }));
  const given = (settled.startingCells ?? []).map((cells, k) => ({ pairing: -1 - k, cells: lossy(cells) }));
  return search(task, [...given, ...own]);
}

/**
 * Goes on from given cells (losses, delays and all) towards the same goals: for a cascade that is already near, such as
 * one on a fitted model of the chip. Arms may hold any number of rings; the sections' zeros need at most one an arm.
 */
export function refineCascade(
  cells: readonly InterferometerParameters[],
  outputs: readonly OutputPort[],
  mask: OmegaMask,
  options: Partial<CascadeOptions> = {},
): OptimisedCascade {
  const settled: CascadeOptions = { ...CASCADE_DEFAULTS, ...options };
  const poles = cells.flatMap((cell) => cell.arms.flatMap((arm) => arm.rings)).length;
  return search(taskOf(outputs, mask, settled, poles), [{ pairing: 0, cells }]);
}

function taskOf(outputs: readonly OutputPort[], mask: OmegaMask, options: CascadeOptions, poles: number): Task {
  if (!mask.bands.some((band) => band.minTransmissionDb !== undefined))
    throw new RangeError('A mask to optimise over needs a passband.');
  if (options.goal === 'DEEPEST_STOPBAND' && !mask.bands.some((band) => band.maxTransmissionDb !== undefined))
    throw new RangeError('The deepest stopband needs a stopband.');
  return { outputs, mask, options, poles };
}
