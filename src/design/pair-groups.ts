/** Every family's variants as all-pass pairs on the chip; of each family and order, the one that does best there. */
import type { ChipModel } from '../chip/index.ts';
import { Refusal } from '../errors.ts';
import type { FamilyPlans, FilterPlan } from '../filter/index.ts';
import type { Group } from './groups.ts';
import { type Realisation, realisePair } from './realisation.ts';

/** dB of margin within which two variants count as equal; then the one with the least largest pole radius wins. */
const EQUAL_MARGIN_DB = 1e-3;

export function pairGroups(
  families: readonly FamilyPlans[],
  chip: ChipModel,
  onProgress: (part: number) => void,
): Group[] {
  const byOrder = families.flatMap(({ family, plans }) => {
    const orders = [...new Set(plans.map((plan) => plan.order))];
    return orders.map((order) => ({ family, order, plans: plans.filter((plan) => plan.order === order) }));
  });
  return byOrder.map(({ family, order, plans }, done) => {
    const { best, refusal } = bestOf(plans, chip);
    onProgress((done + 1) / byOrder.length);
    return { family, architecture: 'ALL_PASS_PAIR', order, best, refusal };
  });
}

function bestOf(
  plans: readonly FilterPlan[],
  chip: ChipModel,
): { best: Realisation | null; refusal: Refusal | null } {
  let best: Realisation | null = null;
  let refusal: Refusal | null = null;
  for (const plan of plans) {
    try {
      const realisation = realisePair(plan, chip);
      if (best === null || isBetter(realisation, best)) best = realisation;
    } catch (error) {
      if (!(error instanceof Refusal)) throw error;
      refusal ??= error;
    }
  }
  return { best, refusal: best === null ? refusal : null };
}

function isBetter(a: Realisation, b: Realisation): boolean {
  const gained = a.onChip.worstMarginDb - b.onChip.worstMarginDb;
  return Math.abs(gained) > EQUAL_MARGIN_DB ? gained > 0 : largestRadius(a) < largestRadius(b);
}

const largestRadius = ({ plan }: Realisation): number =>
  Math.max(...plan.filter.poles.map((pole) => pole.abs()));
