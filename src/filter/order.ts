/**
 * Least orders, and the freedom that an order leaves: rejection, ripple or either edge from the other three. All of a
 * low-pass (0 < pass edge < stop edge < π); a high-pass is its mirror image, Ω → π − Ω. Demands are met exactly by
 * some design edge of the family, see `designEdges`.
 */
import { Refusal } from '../errors.ts';
import { prewarp, unwarp } from './bilinear.ts';
import {
  discriminationExcess,
  excessOfModulus,
  orderBetween,
  selectivityExcess,
  wholeOrder,
} from './discrimination.ts';
import { discriminationOf } from './families.ts';
import { guardContrast, guardEdge, guardOrder, guardReach, guardRejection, guardRipple } from './guards.ts';
import { attenuationDb, rippleFactor } from './ripple-factor.ts';
import type { Family } from './specification.ts';

/** Transmission ≥ −rippleDb up to `passEdgeRad`, ≤ −rejectionDb from `stopEdgeRad` on, both against the peak. */
export interface LowPassDemand {
  readonly passEdgeRad: number;
  readonly stopEdgeRad: number;
  readonly rippleDb: number;
  readonly rejectionDb: number;
}

export interface LeastOrder {
  readonly order: number;
  /** Before rounding up. */
  readonly exactOrder: number;
}

function guardEdges(passEdgeRad: number, stopEdgeRad: number): void {
  guardEdge(passEdgeRad);
  guardEdge(stopEdgeRad);
  if (passEdgeRad < stopEdgeRad) return;
  throw new Refusal({
    code: 'SPECIFICATION_INVALID',
    detail: 'The passband must end before the stopband begins.',
    given: [passEdgeRad, stopEdgeRad],
  });
}

/** w_stop/w_pass − 1 = sin((Ω_s − Ω_p)/2) / (cos(Ω_s/2)·sin(Ω_p/2)). */
function edgeExcess(passEdgeRad: number, stopEdgeRad: number): number {
  guardEdges(passEdgeRad, stopEdgeRad);
  const gap = Math.sin((stopEdgeRad - passEdgeRad) / 2);
  return gap / (Math.cos(stopEdgeRad / 2) * Math.sin(passEdgeRad / 2));
}

/** ε_stop/ε_pass − 1. */
function contrastExcess(rippleDb: number, rejectionDb: number): number {
  guardRipple(rippleDb);
  guardRejection(rejectionDb);
  guardContrast(rippleDb, rejectionDb);
  return excessOfModulus(discriminationOf(rippleDb, rejectionDb));
}

/** The least order of a family that meets a demand. Refused beyond the greatest order that is designed. O(1). */
export function leastOrder(family: Family, demand: LowPassDemand): LeastOrder {
  const edges = edgeExcess(demand.passEdgeRad, demand.stopEdgeRad);
  const contrast = contrastExcess(demand.rippleDb, demand.rejectionDb);
  const exactOrder = orderBetween(family, edges, contrast);
  const order = wholeOrder(exactOrder);
  guardReach(order, demand);
  return { order, exactOrder };
}

/** The greatest rejection, dB, that an order reaches from `stopEdgeRad` on with this ripple up to `passEdgeRad`. */
export function reachableRejectionDb(
  family: Family,
  order: number,
  demand: Omit<LowPassDemand, 'rejectionDb'>,
): number {
  guardOrder(order);
  guardRipple(demand.rippleDb);
  const excess = discriminationExcess(family, order, edgeExcess(demand.passEdgeRad, demand.stopEdgeRad));
  return attenuationDb(rippleFactor(demand.rippleDb) * (1 + excess));
}

/** The least ripple, dB, up to `passEdgeRad` with which an order still rejects by `rejectionDb` from `stopEdgeRad` on. */
export function reachableRippleDb(
  family: Family,
  order: number,
  demand: Omit<LowPassDemand, 'rippleDb'>,
): number {
  guardOrder(order);
  guardRejection(demand.rejectionDb);
  const excess = discriminationExcess(family, order, edgeExcess(demand.passEdgeRad, demand.stopEdgeRad));
  return attenuationDb(rippleFactor(demand.rejectionDb) / (1 + excess));
}

/** The nearest Ω from which on an order rejects by `rejectionDb`; for an elliptic filter its natural stopband edge. */
export function reachableStopEdgeRad(
  family: Family,
  order: number,
  demand: Omit<LowPassDemand, 'stopEdgeRad'>,
): number {
  guardOrder(order);
  guardEdge(demand.passEdgeRad);
  const excess = selectivityExcess(family, order, contrastExcess(demand.rippleDb, demand.rejectionDb));
  return unwarp(prewarp(demand.passEdgeRad) * (1 + excess));
}

/** The farthest Ω up to which an order keeps to `rippleDb` when it must reject from `stopEdgeRad` on. */
export function reachablePassEdgeRad(
  family: Family,
  order: number,
  demand: Omit<LowPassDemand, 'passEdgeRad'>,
): number {
  guardOrder(order);
  guardEdge(demand.stopEdgeRad);
  const excess = selectivityExcess(family, order, contrastExcess(demand.rippleDb, demand.rejectionDb));
  return unwarp(prewarp(demand.stopEdgeRad) / (1 + excess));
}

/** The −3.0103 dB edge of the Butterworth design that attenuates by exactly `attenuation` dB at `omegaRad`. */
export function butterworthEdgeRad(order: number, omegaRad: number, attenuation: number): number {
  guardOrder(order);
  guardEdge(omegaRad);
  guardRejection(attenuation);
  return unwarp(prewarp(omegaRad) / rippleFactor(attenuation) ** (1 / order));
}

/** Natural stopband edge of an elliptic design: where its equal minima of rejection begin. */
export const naturalStopEdgeRad = (order: number, design: Omit<LowPassDemand, 'stopEdgeRad'>): number =>
  reachableStopEdgeRad('ELLIPTIC', order, design);

/** Design edges of a family that meet a demand; from `lowRad`, exact in the passband, to `highRad`, exact in the stopband. */
export interface DesignEdges {
  readonly lowRad: number;
  readonly highRad: number;
}

/**
 * The interval of design edges Ω with which `order` meets `demand`; empty (low > high) when the order is too low.
 * Chebyshev I and elliptic are designed with the demand's ripple, Chebyshev II and elliptic with its rejection.
 */
export function designEdges(family: Family, order: number, demand: LowPassDemand): DesignEdges {
  guardOrder(order);
  guardEdges(demand.passEdgeRad, demand.stopEdgeRad);
  const pass = prewarp(demand.passEdgeRad);
  const stop = prewarp(demand.stopEdgeRad);
  const needed = selectivityExcess(family, order, contrastExcess(demand.rippleDb, demand.rejectionDb));
  if (family === 'BUTTERWORTH') {
    return {
      lowRad: butterworthEdgeRad(order, demand.passEdgeRad, demand.rippleDb),
      highRad: butterworthEdgeRad(order, demand.stopEdgeRad, demand.rejectionDb),
    };
  }
  if (family === 'CHEBYSHEV_II') return { lowRad: unwarp(pass * (1 + needed)), highRad: demand.stopEdgeRad };
  return { lowRad: demand.passEdgeRad, highRad: unwarp(stop / (1 + needed)) };
}
