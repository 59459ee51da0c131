/**
 * A question that closed forms allow and the chip's couplers, arms or losses do not: what would fit instead. Every
 * suggestion has been placed on the chip as an all-pass pair before it is made.
 */
import type { ChipModel } from '../chip/index.ts';
import { type Change, Refusal, type Suggestion } from '../errors.ts';
import { type FilterSpecification, type IntervalGhz, planFilters } from '../filter/index.ts';
import { capacityOf } from './capacity.ts';
import { plansFor } from './check-question.ts';
import type { DesignQuestion } from './design.ts';
import { pairGroups } from './pair-groups.ts';

/** Widths of the band tried, as shares of the one asked for, nearest first. Rings' couplings go about with the width. */
const WIDTHS: readonly number[] = [
  1.25, 0.8, 1.5, 0.65, 2, 0.5, 3, 0.35, 4.5, 0.25, 7, 0.15, 10, 20, 50, 100, 300, 1000, 3000, 10_000,
];

/** Suggested widths are rounded to this many digits. */
const WIDTH_DIGITS = 4;

type Tree = { [key: string]: Tree | unknown };

function withChange(question: DesignQuestion, { pointer, works }: Change): DesignQuestion {
  const copy = structuredClone(question) as unknown as Tree;
  const path = pointer.split('/').slice(1);
  const last = path.pop()!;
  const at = path.reduce((node, key) => node[key] as Tree, copy);
  // Of a band, the two ends stand in the band itself.
  if (last === 'interval') Object.assign(at, works);
  else if (works === null) delete at[last];
  else at[last] = works;
  return copy as unknown as DesignQuestion;
}

function fitsAsPair(question: DesignQuestion, chip: ChipModel): boolean {
  if (question.synthesis.architecture === 'SECTION_CASCADE') return false;
  try {
    return pairGroups(plansFor(question, chip), chip, () => {}).some((group) => group.best !== null);
  } catch (error) {
    if (error instanceof Refusal) return false;
    throw error;
  }
}

/** What the closed forms suggest where there are fewer rings: the first number of rings that really holds something. */
function fewerRings({ specification, synthesis }: DesignQuestion, chip: ChipModel): readonly Suggestion[][] {
  const { order: most } = capacityOf(chip, specification, synthesis.architecture);
  return Array.from({ length: Math.max(0, most - 1) }, (_, k) => most - 1 - k).map((order) => {
    try {
      planFilters(specification, chip.fsrGhz, { order, halfBandOrder: order, limit: 'RINGS' });
      return [];
    } catch (error) {
      if (!(error instanceof Refusal)) throw error;
      return [...(error.details.nearest ?? [])];
    }
  });
}

function otherWidths({ family }: FilterSpecification): Suggestion[] {
  if (!family?.band || family.shape === 'INTERLEAVER') return [];
  const { lowGhz, highGhz } = family.band;
  const middle = (lowGhz + highGhz) / 2;
  return WIDTHS.map((share) => {
    const half = Number((((highGhz - lowGhz) / 2) * share).toPrecision(WIDTH_DIGITS));
    const works: IntervalGhz = { lowGhz: middle - half, highGhz: middle + half };
    return {
      reason: share > 1 ? 'a wider band' : 'a narrower band',
      changes: [{ pointer: '/specification/family/band', given: family.band, works, unit: 'GHz' }],
    };
  });
}

function asPair({ synthesis }: DesignQuestion): Suggestion[] {
  if (synthesis.architecture !== 'SECTION_CASCADE') return [];
  const change = { given: synthesis.architecture, works: 'ALL_PASS_PAIR' };
  return [{ reason: 'an all-pass pair', changes: [{ pointer: '/synthesis/architecture', ...change }] }];
}

/** The least changes found that this chip holds; of each kind the first. Cost: a few milliseconds a try. */
function nearestThatFits(question: DesignQuestion, chip: ChipModel): Suggestion[] {
  const works = ({ changes }: Suggestion) => fitsAsPair(changes.reduce(withChange, question), chip);
  const first = (suggestions: readonly Suggestion[]) => suggestions.filter(works).slice(0, 1);
  const fewer = fewerRings(question, chip)
    .map((suggestions) => suggestions.filter(works))
    .find((fitting) => fitting.length > 0);
  const width = otherWidths(question.specification).find(works);
  return [...first(asPair(question)), ...(width ? [width] : []), ...(fewer ?? [])];
}

/** The same refusal with what would fit. Refusals of closed forms already say what does. */
export function withNearest(refusal: Refusal, question: DesignQuestion, chip: ChipModel): Refusal {
  const { details } = refusal;
  if (details.code !== 'SPECIFICATION_UNREACHABLE' || details.nearest) return refusal;
  return new Refusal({ ...details, nearest: nearestThatFits(question, chip) });
}
