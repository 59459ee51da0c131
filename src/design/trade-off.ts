/** Loss against stop edge of a cascade: near the filter's own stop edge a cliff, so the person who asks should see it. */
import type { ChipModel } from '../chip/index.ts';
import type { FilterPlan, OutputPort } from '../filter/index.ts';
import { type CascadeOptions, cascadeTradeOff } from '../synthesis/index.ts';
import type { TradeOffRecord } from './design.ts';

/** How much further out the stopband may begin, as shares of half the FSR. */
const STEPS = [0.02, 0.04, 0.08] as const;

/** Each point is an optimisation of its own; beyond two sections they take too long for a remark. */
const MOST_SECTIONS = 2;

/** Empty where the filter has no stopband of its own, or no room to move it. */
export function tradeOffOf(
  plan: FilterPlan,
  outputs: readonly OutputPort[],
  options: Partial<Omit<CascadeOptions, 'goal' | 'startingCells'>>,
  chip: ChipModel,
): readonly TradeOffRecord[] {
  const { stopEdgeRad, rejectionDb, centreRad, passEdgeRad, rippleDb } = plan;
  if (stopEdgeRad === null || rejectionDb === null || outputs.length > MOST_SECTIONS) return [];
  const edges = STEPS.map((step) => stopEdgeRad + step * Math.PI).filter((edge) => edge < Math.PI);
  const ask = { centreRad, passEdgeRad, rippleDb, rejectionDb };
  const points = cascadeTradeOff(plan.filter, outputs, ask, edges, options);
  return points.map((point) => ({
    stopEdgeGhz: (point.stopEdgeRad * chip.fsrGhz) / (2 * Math.PI),
    insertionLossDb: point.insertionLossDb,
  }));
}
