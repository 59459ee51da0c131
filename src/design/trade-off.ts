/** Loss against stop edge of a cascade: near the filter's own stop edge a cliff, so the person who asks should see it. */
import type { ChipModel } from '../chip/index.ts';
import type { FilterPlan, OutputPort } from '../filter/index.ts';
import { type CascadeOptions, cascadeTradeOff, type OmegaMask } from '../synthesis/index.ts';
import type { TradeOffRecord } from './design.ts';

const TURN = 2 * Math.PI;

/** How much further out the stopband may begin, as shares of half the FSR. */
const STEPS = [0.02, 0.04, 0.08] as const;

/** Each point is an optimisation of its own; beyond two sections they take too long for a remark. */
const MOST_SECTIONS = 2;

/**
 * Empty where the filter has no stopband, or no room to move it. `mask`: the one that was optimised over; `options`: with
 * the goal it was optimised for, or the change of goal would pass for what the edge saves.
 */
export function tradeOffOf(
  plan: FilterPlan,
  outputs: readonly OutputPort[],
  mask: OmegaMask,
  options: Partial<CascadeOptions>,
  chip: ChipModel,
): readonly TradeOffRecord[] {
  const { stopEdgeRad, centreRad } = plan;
  if (stopEdgeRad === null || outputs.length > MOST_SECTIONS) return [];
  const edges = STEPS.map((step) => stopEdgeRad + step * Math.PI).filter((edge) => edge < Math.PI);
  const maskAt = (edge: number): OmegaMask => withStopbandsBeyond(mask, centreRad, edge);
  const kept = edges.filter((edge) =>
    maskAt(edge).bands.some((band) => band.maxTransmissionDb !== undefined),
  );
  const points = cascadeTradeOff(plan.filter, outputs, maskAt, kept, options);
  return points.map((point) => ({
    stopEdgeGhz: Number(((point.stopEdgeRad * chip.fsrGhz) / TURN).toPrecision(12)),
    insertionLossDb: point.insertionLossDb,
  }));
}

/** Stopbands cut where they come nearer to the centre than `edgeRad`; one that lies wholly nearer is gone. */
function withStopbandsBeyond(mask: OmegaMask, centreRad: number, edgeRad: number): OmegaMask {
  return {
    reference: mask.reference,
    bands: mask.bands.flatMap((band) => {
      if (band.maxTransmissionDb === undefined) return [band];
      const turns = Math.floor((band.lowRad - centreRad) / TURN) * TURN + centreRad;
      const lowRad = Math.max(band.lowRad, turns + edgeRad);
      const highRad = Math.min(band.highRad, turns + TURN - edgeRad);
      return lowRad <= highRad ? [{ ...band, lowRad, highRad }] : [];
    }),
  };
}
