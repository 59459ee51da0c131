/**
 * Placing an ideal circuit on a chip: which cells, which rings, what happens to all that is left over.
 *
 * An all-pass pair takes one cell, or a row of cells that both guides join (joining couplers at 0, arms one after the
 * other: no loss by cascading). A cascade of sections takes cells that one guide joins, in the chip's order. Unused cells
 * pass the light on.
 */
import type { InterferometerParameters } from '../circuit/circuit.ts';
import type { OutputPort } from '../filter/specification.ts';
import { runsOf } from './capacity.ts';
import type { ChipModel } from './model.ts';
import { planPassThrough, planTwoGuides } from './pass-through.ts';
import { assemble, type PlacedCircuit } from './placed.ts';
import { tooFewRings } from './refusals.ts';
import { type PlannedCells, planRun, type Run } from './run.ts';
import { cleanest, fitSections, together } from './sections.ts';

export type IdealCircuit =
  | { readonly architecture: 'ALL_PASS_PAIR'; readonly cell: InterferometerParameters }
  | { readonly architecture: 'SECTION_CASCADE'; readonly cells: readonly InterferometerParameters[] };

export interface FitOptions {
  /** The output of the whole chip that shall carry the filter. */
  readonly output: OutputPort;
  /** The output of each ideal cell that carries it; `output` where absent. */
  readonly carriedOn?: OutputPort;
  /** Ω (rad) where the response does not matter: rings that cannot decouple are made resonant there. */
  readonly parkAtRad: number;
  /** Both outputs are used, so that nothing may follow the cell that makes them. */
  readonly bothOutputs?: boolean;
}

/** The output by which light leaves a cell for the next one, or the chip. */
function portOf(chip: ChipModel, index: number, output: OutputPort): OutputPort {
  return index === chip.cells.length - 1 || chip.join === 'BOTH' ? output : chip.join;
}

function placePair(
  ideal: InterferometerParameters,
  chip: ChipModel,
  options: FitOptions,
  run: Run,
  section: number | null,
): PlannedCells {
  const { output, parkAtRad, carriedOn = output, bothOutputs = false } = options;
  const joined = chip.join === 'BOTH';
  const port = portOf(chip, run.last, output);
  const pass = (index: number) => {
    if (joined) return planTwoGuides(chip, index, index < run.first ? 'FIRST' : 'BOTH', parkAtRad);
    return planPassThrough(chip, index, portOf(chip, index, output), parkAtRad);
  };
  const middle = planRun(chip, run, { ideal, carriedOn, port, section, parkAtRad, bothOutputs });
  const before = Array.from({ length: run.first }, (_, index) => pass(index));
  const after = chip.cells.slice(run.last + 1).map((_, k) => pass(run.last + 1 + k));
  return together([...before, middle, ...after]);
}

function fitPair(
  ideal: InterferometerParameters,
  chip: ChipModel,
  options: FitOptions,
  section: number | null,
): PlannedCells {
  const last = chip.cells.length - 1;
  const runs = runsOf(chip).filter(
    (run) => !options.bothOutputs || chip.join === 'BOTH' || run.last === last,
  );
  return cleanest(runs.map((run) => () => placePair(ideal, chip, options, run, section)));
}

/**
 * Places a lossless ideal circuit on a chip. The placed circuit has the ideal response on `output`, up to a constant phase
 * and a whole delay, except for what `parked` says of rings that cannot decouple and `offBalance` of input and output
 * couplers that cannot be what the ideal wants. The order of sections is kept where it fits, and changed where only that
 * fits, or fits exactly.
 *
 * Throws a Refusal with limit RINGS (counts and delays) or COUPLING_RANGE (element, given, allowed).
 */
export function fitToChip(ideal: IdealCircuit, chip: ChipModel, options: FitOptions): PlacedCircuit {
  const { output, parkAtRad, carriedOn = output } = options;
  if (ideal.architecture === 'ALL_PASS_PAIR')
    return assemble(chip, fitPair(ideal.cell, chip, options, null).plans);
  const [only, ...others] = ideal.cells;
  if (chip.join === 'BOTH' && others.length > 0)
    throw tooFewRings(
      'The cells of this chip are joined by both guides, so that sections cannot follow one another; an all-pass pair can.',
      ideal.cells.length,
      1,
    );
  if (chip.join === 'BOTH' && only) return assemble(chip, fitPair(only, chip, options, 1).plans);
  const portOfCell = (index: number) => portOf(chip, index, output);
  const planned = fitSections(ideal.cells, chip, { carriedOn, parkAtRad, portOf: portOfCell });
  return assemble(chip, planned.plans);
}
