/** What was compared, in which order it is preferred, and how that is said. */
import type { ChipModel } from '../chip/index.ts';
import type { Refusal } from '../errors.ts';
import type { Architecture, Family } from '../filter/index.ts';
import type { Compliance } from '../response/index.ts';
import { orderOn } from './capacity.ts';
import type { Alternative } from './design.ts';
import { exactCascadeLossDb } from './exact-cascade.ts';
import { insertionLossOf, type Realisation, usesBothOutputs } from './realisation.ts';

/** One family in one architecture at one order: its best realisation on the chip, or why there is none. */
export interface Group {
  readonly family: Family;
  readonly architecture: Architecture;
  readonly order: number;
  readonly best: Realisation | null;
  readonly refusal: Refusal | null;
}

export type OpenGroup = Group & { readonly best: Realisation };

const isOpen = (group: Group): group is OpenGroup => group.best !== null;

/**
 * Those that meet the mask with the chip's losses first, cheapest (fewest rings) first and then by margin; then those
 * that miss it, by how little. Throws the first refusal when nothing fits the chip.
 */
export function rank(groups: readonly Group[]): OpenGroup[] {
  const open = groups.filter(isOpen);
  const refusal = groups.find((group) => group.refusal !== null)?.refusal;
  if (open.length === 0 && refusal) throw refusal;
  return open.sort((a, b) => {
    const met = Number(b.best.onChip.met) - Number(a.best.onChip.met);
    if (met !== 0) return met;
    const margin = b.best.onChip.worstMarginDb - a.best.onChip.worstMarginDb;
    return a.best.onChip.met ? a.order - b.order || margin : margin;
  });
}

const NAMES: Record<Architecture, string> = {
  ALL_PASS_PAIR: 'an all-pass pair',
  SECTION_CASCADE: 'a cascade of sections',
};

/** @param set compliance of the chosen one's setting, crosstalk and driver steps included */
export function reasonFor(
  chosen: OpenGroup,
  groups: readonly Group[],
  told: boolean,
  set: Compliance,
): string {
  const { family, order, architecture, best } = chosen;
  const others = groups.filter((group) => group !== chosen && isOpen(group)).length;
  const met = best.onChip.met
    ? `meets the mask on this chip with its losses by ${best.onChip.worstMarginDb.toFixed(2)} dB`
    : `comes nearest to the mask on this chip with its losses (worst margin ${best.onChip.worstMarginDb.toFixed(2)} dB)`;
  const asked = told ? ' (as asked)' : '';
  const compared = others > 0 ? `, best of ${others + 1} compared: fewest rings first, then margin` : '';
  const steps =
    set.met === best.onChip.met
      ? ''
      : ` The setting, in whole driver steps, ${set.met ? 'meets' : 'misses'} it (worst margin ${set.worstMarginDb.toPrecision(2)} dB).`;
  const remarks = best.remarks.length > 0 ? ` ${best.remarks.join(' ')}` : '';
  return `${family} of order ${order} as ${NAMES[architecture]}${asked} ${met}${compared}.${steps}${remarks}`;
}

export function alternativeOf(group: Group, chosen: boolean, chip: ChipModel): Alternative {
  const { family, architecture, order, best, refusal } = group;
  return {
    family,
    architecture,
    order,
    rings: best === null ? order : ringsUsed(best),
    fits: best !== null,
    worstMarginDb: best === null ? null : best.onChip.worstMarginDb,
    insertionLossDb: best === null ? null : insertionLossOf(best, chip),
    reason: chosen ? 'chosen' : (refusal?.message ?? describe(best!)),
  };
}

/** Fewer than the order where an arm's plain delay is the pole at 0. */
const ringsUsed = ({ placed }: Realisation): number =>
  placed.cells.reduce((sum, cell) => sum + cell.rings.filter((ring) => !ring.parked).length, 0);

function describe(best: Realisation): string {
  const { met, worstMarginDb } = best.onChip;
  return met
    ? `meets the mask by ${worstMarginDb.toFixed(2)} dB`
    : `misses the mask by ${(-worstMarginDb).toFixed(2)} dB`;
}

/** Beside a chosen pair: what the same filter would lose as exact sections, known in closed form without placing it. */
export function cascadeBeside(chosen: OpenGroup, groups: readonly Group[], chip: ChipModel): Alternative[] {
  const { plan } = chosen.best;
  if (
    chosen.architecture !== 'ALL_PASS_PAIR' ||
    groups.some((group) => group.architecture === 'SECTION_CASCADE')
  )
    return [];
  const lossDb = exactCascadeLossDb(plan.filter, plan.centreRad);
  const fits = orderOn(chip, 'SECTION_CASCADE') >= plan.order && !usesBothOutputs(plan);
  return [
    {
      family: plan.family,
      architecture: 'SECTION_CASCADE',
      order: plan.order,
      rings: plan.order,
      fits,
      worstMarginDb: null,
      insertionLossDb: lossDb,
      reason: `as exact passive sections the filter would lose ${lossDb.toFixed(1)} dB before any loss of the chip, the pair none; ${fits ? 'joint optimisation over the mask would make that less, and was not needed' : 'and it does not fit the cells of this chip'}`,
    },
  ];
}
