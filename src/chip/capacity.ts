/** How much filter a chip can hold, by counting its rings: quick refusals before anything is synthesised. */
import { compensatingRings, REACH_SLACK } from './arms.ts';
import { ringCount } from './elements.ts';
import type { ChipModel } from './model.ts';
import { delayOf, type Run, slotsOf } from './run.ts';

export interface RingCapacity {
  readonly allPassPair: {
    /** Largest order of any filter, 0 where none fits; and of an odd half-band one, whose pole at 0 may be a plain delay. */
    readonly order: number;
    readonly halfBandOrder: number;
    /** Rings on the two arms that `order` has to itself, and the cells that hold them. */
    readonly arms: readonly [number, number];
    readonly cells: readonly string[];
  };
  readonly sectionCascade: {
    /** Cells that hold a section of second order, and those that hold only one of first order. */
    readonly secondOrderSections: number;
    readonly firstOrderSections: number;
    readonly order: number;
  };
}

/** Whether arms of these many rings and these plain delays fit, as they are or exchanged. */
function holds(
  chip: ChipModel,
  run: Run,
  rings: readonly [number, number],
  delay: readonly [number, number],
): boolean {
  const slots = slotsOf(chip, run);
  const { ringDelay } = chip.cells[run.first]!;
  const cells = chip.cells.slice(run.first, run.last + 1);
  if (cells.some((cell) => cell.ringDelay !== ringDelay)) return false;
  // A filter's poles are made by rings of one unit delay; longer ones serve as plain delay only.
  if (rings[0] + rings[1] > 0 && ringDelay !== 1) return false;
  return ([0, 1] as const).some((swap) => {
    const here: readonly [number, number] = [delay[swap], delay[(1 - swap) as 0 | 1]];
    const full = compensatingRings(here, delayOf(chip, run), ringDelay);
    if (full === null) return false;
    return ([0, 1] as const).every((arm) => {
      const reachFull = slots[arm].filter((slot) => slot.coupler.maxCoupling >= 1 - REACH_SLACK).length;
      const wanted = rings[arm === 0 ? swap : ((1 - swap) as 0 | 1)];
      return full[arm] <= reachFull && wanted + full[arm] <= slots[arm].length;
    });
  });
}

/** Poles of the two arms of order N, alternately labelled. */
const split = (order: number): readonly [number, number] => [Math.ceil(order / 2), Math.floor(order / 2)];

/** Of an odd half-band filter one pole is 0: the middle one, so that the arm with an odd number of poles has it. */
function holdsHalfBand(chip: ChipModel, run: Run, order: number): boolean {
  const [more, fewer] = split(order);
  return more % 2 === 1
    ? holds(chip, run, [more - 1, fewer], [1, 0])
    : holds(chip, run, [more, fewer - 1], [0, 1]);
}

/** Cells that can hold one all-pass pair: every single cell, or every row of cells that both guides join. */
export function runsOf(chip: ChipModel): Run[] {
  const last = chip.cells.length - 1;
  if (chip.join !== 'BOTH')
    return chip.cells.map((_, index) => ({ first: last - index, last: last - index }));
  return chip.cells.flatMap((_, first) =>
    Array.from({ length: chip.cells.length - first }, (_, length) => ({ first, last: first + length })),
  );
}

/** Counts only: reaches of couplers, losses and parking are looked at when a circuit is placed. Cost O(cells²·rings). */
export function ringCapacity(chip: ChipModel): RingCapacity {
  const runs = runsOf(chip);
  const most = chip.cells.reduce((sum, cell) => sum + ringCount(cell), 0) + 1;
  let order = 0;
  let halfBandOrder = 0;
  let at: Run | null = null;
  for (const run of runs)
    for (let n = 1; n <= most; n++) {
      if (n > order && holds(chip, run, split(n), [0, 0])) {
        order = n;
        at = run;
      }
      if (n % 2 === 1 && n > halfBandOrder && holdsHalfBand(chip, run, n)) halfBandOrder = n;
    }
  const single = chip.cells.map((_, index) => ({ first: index, last: index }));
  const second = single.filter((run) => holds(chip, run, [1, 1], [0, 0])).length;
  const first = single.filter((run) => holds(chip, run, [1, 0], [0, 0])).length - second;
  const [secondOrderSections, firstOrderSections] =
    chip.join === 'BOTH' ? [Math.min(1, second), second > 0 ? 0 : Math.min(1, first)] : [second, first];
  return {
    allPassPair: {
      order,
      halfBandOrder: Math.max(halfBandOrder, order - ((order + 1) % 2)),
      arms: split(order),
      cells: at ? chip.cells.slice(at.first, at.last + 1).map((cell) => cell.name) : [],
    },
    sectionCascade: {
      secondOrderSections,
      firstOrderSections,
      order: 2 * secondOrderSections + firstOrderSections,
    },
  };
}
