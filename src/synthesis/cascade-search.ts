/**
 * The search behind the joint optimisation of a cascade: screening of all starts by their merit, then rounds of the
 * minimax method (src/optimise) in which ever fewer starts get ever more evaluations (successive halving, K. Jamieson and
 * A. Talwalkar, AISTATS 2016, with fixed rounds). The best is finished on a grid four times as dense. Deterministic.
 */
import type { InterferometerParameters } from '../circuit/index.ts';
import type { OutputPort } from '../filter/index.ts';
import { type MinimaxResult, minimiseMaximum } from '../optimise/index.ts';
import { type CascadeModel, createCascadeModel, ringDepth } from './cascade-model.ts';
import type { CascadeOptions } from './cascade-options.ts';
import type { CascadeStart } from './cascade-starts.ts';
import {
  type CascadeGoal,
  type CascadeProblem,
  type MaskGrid,
  maskGrid,
  maskProblem,
  type OmegaMask,
} from './mask-problem.ts';

/** Starts kept after each round, and evaluations each of them gets in it. */
const ROUNDS: readonly { readonly kept: number; readonly evaluations: number }[] = [
  { kept: 48, evaluations: 30 },
  { kept: 12, evaluations: 40 },
  { kept: 4, evaluations: 150 },
];
const FINISHING_DENSITY = 4;
const FINISHING_EVALUATIONS = 80;

/** dB per dB of violation. Ten is too little: near its cliff the half-band trades 7 dB of loss for 0.6 dB of ripple. */
const PENALTY = 50;
/** Deep nulls are left out of a step's model: their dB are far from linear, and far from leading. */
const WINDOW_DB = 25;
const GAIN_TOLERANCE_DB = 1e-5;
const INITIAL_DAMPING = 10;
/** Merits this close, relatively, are one and the same solution seen twice. */
const SAME_MERIT = 1e-6;
/** Nothing passive does better than no loss; stop within this of it. */
const LOSSLESS_DB = 1e-3;

export interface Task {
  readonly outputs: readonly OutputPort[];
  readonly mask: OmegaMask;
  readonly options: CascadeOptions;
  readonly poles: number;
}

/** A problem with the grid and the model that it is made of. */
export interface Bench {
  readonly problem: CascadeProblem;
  readonly grid: MaskGrid;
  readonly model: CascadeModel;
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
  const violation = values
    .subarray(problem.objectives)
    .reduce((a, b) => Math.max(a, b), Number.NEGATIVE_INFINITY);
  return { pairing, bench, x, merit: meritOf({ value, violation }) };
}

/**
 * The best of every pairing first, then the best of all, so that no pairing is lost to a poor first guess. Of runs with
 * the same merit one goes on: under a symmetric mask mirror images and swapped cells come to the same thing.
 */
function shortlist(runs: readonly Run[], kept: number): Run[] {
  const sorted = [...runs]
    .sort((a, b) => a.merit - b.merit)
    .filter((run, k, all) => k === 0 || run.merit - all[k - 1]!.merit > SAME_MERIT * Math.abs(run.merit));
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

export interface FoundCascade {
  readonly bench: Bench;
  readonly x: Float64Array;
  readonly starts: number;
  readonly evaluations: number;
}

/** The best cascade found from these starts, on the dense grid. Throws whatever the progress callback throws. */
export function searchCascade(task: Task, starts: readonly CascadeStart[]): FoundCascade {
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
  return { bench: finished.bench, x: finished.x, starts: starts.length, evaluations };
}
