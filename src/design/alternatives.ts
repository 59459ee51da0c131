/** How a choice and what was compared beside it are said. */
import type { ChipModel } from '../chip/index.ts';
import type { Architecture } from '../filter/index.ts';
import type { Compliance } from '../response/index.ts';
import { orderOn } from './capacity.ts';
import type { Alternative } from './design.ts';
import { exactCascadeLossDb } from './exact-cascade.ts';
import { type Group, isSet, type SetGroup } from './groups.ts';
import { insertionLossOf, type Realisation, usesBothOutputs } from './realisation.ts';

const NAMES: Record<Architecture, string> = {
  ALL_PASS_PAIR: 'an all-pass pair',
  SECTION_CASCADE: 'a cascade of sections',
};

export function reasonFor(chosen: SetGroup, groups: readonly Group[], told: boolean): string {
  const { family, order, architecture, best, compliance } = chosen;
  const others = groups.filter((group) => group !== chosen && isSet(group)).length;
  const asked = told ? ' (as asked)' : '';
  const compared = others > 0 ? `, best of ${others + 1} compared: fewest rings first, then margin` : '';
  const remarks = best.remarks.length > 0 ? ` ${best.remarks.join(' ')}` : '';
  return `${family} of order ${order} as ${NAMES[architecture]}${asked} ${verdict(compliance)} as set on this chip${compared}.${remarks}`;
}

/** Two digits, however small: a mask missed by 0.004 dB is missed. */
function verdict({ met, worstMarginDb }: Compliance): string {
  const size = Math.abs(worstMarginDb);
  const margin = size < 0.01 ? (size < 1e-6 ? '0' : size.toPrecision(1)) : size.toFixed(2);
  return met ? `meets the mask by ${margin} dB` : `misses the mask by ${margin} dB`;
}

export function alternativeOf(group: Group, chosen: boolean, chip: ChipModel): Alternative {
  const { family, architecture, order, best, refusal } = group;
  const set = isSet(group) ? group : null;
  return {
    family,
    architecture,
    order,
    rings: best === null ? order : ringsUsed(best),
    fits: set !== null,
    worstMarginDb: set?.compliance.worstMarginDb ?? null,
    insertionLossDb: best === null ? null : insertionLossOf(best, chip),
    reason: chosen ? 'chosen' : (refusal?.message ?? verdict(set!.compliance)),
  };
}

/** Fewer than the order where an arm's plain delay is the pole at 0. */
const ringsUsed = ({ placed }: Realisation): number =>
  placed.cells.reduce((sum, cell) => sum + cell.rings.filter((ring) => !ring.parked).length, 0);

/** Below this, dB, a loss is rounding. */
const NO_LOSS_DB = 1e-9;

/** Beside a chosen pair: what the same filter would lose as exact sections, known in closed form without placing it. */
export function cascadeBeside(chosen: SetGroup, groups: readonly Group[], chip: ChipModel): Alternative[] {
  const { plan } = chosen.best;
  const compared = groups.some((group) => group.architecture === 'SECTION_CASCADE');
  if (chosen.architecture !== 'ALL_PASS_PAIR' || compared) return [];
  const exactDb = exactCascadeLossDb(plan.filter, plan.centreRad);
  const lossDb = exactDb < NO_LOSS_DB ? 0 : exactDb;
  const fits = orderOn(chip, 'SECTION_CASCADE') >= plan.order && !usesBothOutputs(plan);
  const loss =
    lossDb === 0
      ? 'as one exact passive section the filter loses nothing either'
      : `as exact passive sections the filter would lose ${lossDb.toFixed(1)} dB before any loss of the chip, the pair none`;
  const place = fits
    ? 'the pair served and no cascade was optimised'
    : 'it does not fit the cells of this chip';
  return [
    {
      family: plan.family,
      architecture: 'SECTION_CASCADE',
      order: plan.order,
      rings: plan.order,
      fits,
      worstMarginDb: null,
      insertionLossDb: lossDb,
      reason: `${loss}; ${place}`,
    },
  ];
}
