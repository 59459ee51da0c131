/**
 * Joint optimisation of all cells of a cascade over a mask. Exact sections pay for their passivity (10.5 dB for the
 * fourth-order half-band of 2 dB and 40 dB at its own stop edge); cells that need only meet the mask together pay far
 * less as soon as the stop edge may move. Zeros of a lossless balanced cell stay where its two arms can cancel.
 */
import type { InterferometerParameters } from '../circuit/index.ts';
import type { FilterSection, OutputPort, TransferFunction } from '../filter/index.ts';
import { CASCADE_DEFAULTS, type CascadeOptions } from './cascade-options.ts';
import { type FoundCascade, searchCascade, type Task } from './cascade-search.ts';
import { cascadeStarts } from './cascade-starts.ts';
import { withLosses } from './interferometer.ts';
import { brightest, type OmegaMask, worstMiss } from './mask-problem.ts';
import { sectionOf } from './section.ts';
import { type CascadeCell, needsOutputs } from './section-cascade.ts';

/** A demand missed by less than this is kept: below what a lab can measure. */
const KEPT_DB = 0.01;

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

function report(task: Task, found: FoundCascade): OptimisedCascade {
  const { bench, starts, evaluations } = found;
  const parameters = bench.problem.parametersOf(found.x);
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
    reason: `Optimised jointly over the mask from ${starts === 1 ? 'the given cells' : `${starts} starts over the pairings of the poles, mirrored or not`}: ${insertionLossDb.toFixed(2)} dB insertion loss, ${met ? 'all demands kept' : `worst demand missed by ${miss.toFixed(2)} dB`}.`,
  };
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
  return report(task, searchCascade(task, [...given, ...own]));
}

/**
 * Goes on from given cells (losses, delays and all) towards the same goals: for a cascade that is already near, such as
 * one on a fitted model of the chip. Throws RangeError for cells that are no sections: more than one ring an arm, rings
 * of other than unit delay, arms with a plain delay.
 */
export function refineCascade(
  cells: readonly InterferometerParameters[],
  outputs: readonly OutputPort[],
  mask: OmegaMask,
  options: Partial<CascadeOptions> = {},
): OptimisedCascade {
  const settled: CascadeOptions = { ...CASCADE_DEFAULTS, ...options };
  const poles = cells.flatMap((cell) => cell.arms.flatMap((arm) => arm.rings)).length;
  const task = taskOf(outputs, mask, settled, poles);
  return report(task, searchCascade(task, [{ pairing: 0, cells }]));
}

function taskOf(
  outputs: readonly OutputPort[],
  mask: OmegaMask,
  options: CascadeOptions,
  poles: number,
): Task {
  if (!mask.bands.some((band) => band.minTransmissionDb !== undefined))
    throw new RangeError('A mask to optimise over needs a passband.');
  if (options.goal === 'DEEPEST_STOPBAND' && !mask.bands.some((band) => band.maxTransmissionDb !== undefined))
    throw new RangeError('The deepest stopband needs a stopband.');
  return { outputs, mask, options, poles };
}
