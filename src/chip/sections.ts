/** A cascade of sections onto cells that one guide joins: which cell takes which section, which passes the light on. */
import type { InterferometerParameters } from '../circuit/circuit.ts';
import { Refusal } from '../errors.ts';
import type { OutputPort } from '../filter/specification.ts';
import type { ChipModel } from './model.ts';
import { planPassThrough } from './pass-through.ts';
import { furthest, tooFewRings } from './refusals.ts';
import { isCleaner, type PlannedCells, planRun } from './run.ts';

/** More sections than this are tried in the order given only: 5! = 120 orders. */
const MOST_SECTIONS_TO_PERMUTE = 5;

/** What of a fit's options a cascade needs; `portOf` names the output by which light leaves a cell. */
export interface CascadeRequest {
  readonly carriedOn: OutputPort;
  readonly parkAtRad: number;
  readonly portOf: (index: number) => OutputPort;
}

interface Section {
  readonly ideal: InterferometerParameters;
  readonly number: number;
}

export function together(parts: readonly PlannedCells[]): PlannedCells {
  return {
    plans: parts.flatMap((part) => part.plans),
    leak: parts.reduce((sum, part) => sum + part.leak, 0),
    delayRings: parts.reduce((sum, part) => sum + part.delayRings, 0),
    couplersOff: parts.reduce((sum, part) => sum + part.couplersOff, 0),
    nullField: parts.reduce((sum, part) => sum + part.nullField, 0),
  };
}

/** The first of the cleanest candidates, or the refusal that came furthest. At least one candidate. */
export function cleanest(candidates: readonly (() => PlannedCells)[]): PlannedCells {
  let best: PlannedCells | null = null;
  const refusals: Refusal[] = [];
  for (const candidate of candidates) {
    try {
      const planned = candidate();
      if (best === null || isCleaner(planned, best)) best = planned;
    } catch (reason) {
      if (!(reason instanceof Refusal)) throw reason;
      refusals.push(reason);
    }
  }
  if (best === null) throw furthest(refusals);
  return best;
}

/**
 * Sections in the given order onto cells in the chip's order: each cell takes the next section or passes the light on.
 * Each pair (cells left, sections left) is solved once. Cost O(cells · sections) placements.
 */
function placeInOrder(sections: readonly Section[], chip: ChipModel, request: CascadeRequest): PlannedCells {
  const { carriedOn, parkAtRad, portOf } = request;
  const count = chip.cells.length;
  const known = new Map<string, () => PlannedCells>();
  const attempt = (index: number, next: number): PlannedCells => {
    if (index === count && next === sections.length) return together([]);
    if (count - index < sections.length - next)
      throw tooFewRings(
        `A cascade of ${sections.length} sections needs as many cells with rings for them; the chip has ${count} cells.`,
        sections.length,
        count,
      );
    const port = portOf(index);
    const section = sections[next];
    const pass = () => together([planPassThrough(chip, index, port, parkAtRad), from(index + 1, next)]);
    if (!section) return pass();
    const { ideal, number } = section;
    const run = { first: index, last: index };
    const take = () =>
      planRun(chip, run, { ideal, carriedOn, port, section: number, parkAtRad, bothOutputs: false });
    return cleanest([() => together([take(), from(index + 1, next + 1)]), pass]);
  };
  const from = (index: number, next: number): PlannedCells => {
    const key = `${index} ${next}`;
    const before = known.get(key);
    if (before) return before();
    try {
      const planned = attempt(index, next);
      known.set(key, () => planned);
      return planned;
    } catch (reason) {
      known.set(key, () => {
        throw reason;
      });
      throw reason;
    }
  };
  return from(0, 0);
}

function* permutations<T>(items: readonly T[]): Generator<readonly T[]> {
  if (items.length <= 1) yield items;
  else
    for (const [k, item] of items.entries())
      for (const rest of permutations(items.filter((_, j) => j !== k))) yield [item, ...rest];
}

/**
 * The order given where it fits with exact couplers, any other where only that does: passive sections may follow one
 * another in any order. Where no order has exact couplers, the cleanest.
 */
export function fitSections(
  cells: readonly InterferometerParameters[],
  chip: ChipModel,
  request: CascadeRequest,
): PlannedCells {
  const sections = cells.map((ideal, k) => ({ ideal, number: k + 1 }));
  const refusals: Refusal[] = [];
  let best: PlannedCells | null = null;
  const orders = sections.length <= MOST_SECTIONS_TO_PERMUTE ? permutations(sections) : [sections];
  for (const order of orders) {
    try {
      const planned = placeInOrder(order, chip, request);
      if (planned.couplersOff === 0) return planned;
      if (best === null || isCleaner(planned, best)) best = planned;
    } catch (reason) {
      if (!(reason instanceof Refusal)) throw reason;
      refusals.push(reason);
    }
  }
  if (best !== null) return best;
  throw furthest(refusals);
}
