/**
 * The designs of one family that meet a low-pass demand at a given order. What the demand leaves free (how much of the
 * allowance to spend as ripple, how much to keep) is offered as a short list of variants: which one a chip with loss
 * does best with is decided there, where the loss is known.
 */
import { type BandAsk, designLowPass, rotateFilter } from '../bands.ts';
import { complementOf, complementOfHalfBand } from '../complement.ts';
import { transmissionAt } from '../evaluate.ts';
import { designHalfBand, halfBandIsolationDb } from '../half-band.ts';
import { designEdges, reachablePassEdgeRad, reachableRejectionDb } from '../order.ts';
import type { Family } from '../specification.ts';
import type { LabelledFilter, TransferFunction } from '../transfer-function.ts';
import { MAX_DESIGN_ORDER, type OneBandDemand } from './plan.ts';

export interface Candidate {
  readonly family: Family;
  readonly order: number;
  readonly rippleDb: number;
  readonly rejectionDb: number;
  readonly passEdgeRad: number;
  readonly stopEdgeRad: number;
  /** Rotated to the demand's centre. */
  readonly filter: LabelledFilter;
  readonly complement: () => TransferFunction;
}

/** Shares of the ripple allowance that are tried; the rest stays as margin for what the chip adds. */
const RIPPLE_SHARES = [1, 0.75, 0.5, 0.3, 0.2, 0.1, 0.05, 0.02] as const;

/** Shares of the way from the demanded pass edge to the farthest reachable one: wider bands have wider rings, which lose less. */
const WIDENING_SHARES = [0, 0.5, 0.9] as const;

/** dB by which a demand may be missed by rounding alone. */
const ROUNDING_DB = 1e-6;

/** A zero on the stop edge itself rejects without bound; no more than this is asked of a design. */
const GREATEST_REJECTION_DB = 200;

/** All variants at `order`, or none when the family does not meet the demand with it. */
export function candidatesOf(demand: OneBandDemand, family: Family, order: number): Candidate[] {
  const found: Candidate[] = [];
  for (const stop of stopEdgesTried(demand, family)) {
    for (const rippleShare of RIPPLE_SHARES) {
      const rippleDb = rippleShare * demand.rippleDb;
      for (const passEdgeRad of passEdgesTried(demand, family, order, stop, rippleDb)) {
        const candidate = design({ ...demand, passEdgeRad }, family, order, stop, rippleDb);
        if (candidate) found.push(candidate);
      }
    }
    if (found.length > 0) return found;
  }
  return found;
}

/** The least order at which the family meets the demand, up to `MAX_DESIGN_ORDER`; null beyond. */
export function leastOrderOf(demand: OneBandDemand, family: Family): number | null {
  for (let order = 1; order <= MAX_DESIGN_ORDER; order++) {
    if (meetsAtEdges(demand, family, order)) return order;
  }
  return null;
}

function meetsAtEdges(demand: OneBandDemand, family: Family, order: number): boolean {
  return stopEdgesTried(demand, family).some(
    (stop) => design(demand, family, order, stop, demand.rippleDb) !== null,
  );
}

/** Where the stopband of an equiripple design may begin: any distance at which a demand begins. */
function stopEdgesTried(demand: OneBandDemand, family: Family): readonly number[] {
  const edges = demand.stops.map((stop) => stop.edgeRad);
  return family === 'ELLIPTIC' || family === 'CHEBYSHEV_II' ? edges : edges.slice(0, 1);
}

function passEdgesTried(
  demand: OneBandDemand,
  family: Family,
  order: number,
  stopEdgeRad: number,
  rippleDb: number,
): readonly number[] {
  const { passEdgeRad, stops } = demand;
  const rejectionDb = Math.max(...stops.map((stop) => stop.rejectionDb));
  if (rejectionDb <= rippleDb) return [passEdgeRad];
  const farthest = reachablePassEdgeRad(family, order, { stopEdgeRad, rippleDb, rejectionDb });
  if (farthest <= passEdgeRad) return [passEdgeRad];
  return WIDENING_SHARES.map((share) => passEdgeRad + share * (farthest - passEdgeRad));
}

function design(
  demand: OneBandDemand,
  family: Family,
  order: number,
  stopEdgeRad: number,
  rippleDb: number,
): Candidate | null {
  const { passEdgeRad, centreRad } = demand;
  const reach = reachableRejectionDb(family, order, { passEdgeRad, stopEdgeRad, rippleDb });
  const rejectionDb = Math.min(reach, GREATEST_REJECTION_DB);
  const beyond = demand.stops.filter((stop) => stop.edgeRad >= stopEdgeRad);
  if (beyond.length === 0 || rejectionDb <= rippleDb) return null;
  const ask: BandAsk = {
    family,
    order,
    // Ripple is spent as planned at the pass edge; what the order has to spare becomes rejection.
    edgeRad:
      family === 'CHEBYSHEV_II'
        ? stopEdgeRad
        : designEdges(family, order, { passEdgeRad, stopEdgeRad, rippleDb, rejectionDb }).lowRad,
    rippleDb,
    rejectionDb,
  };
  const prototype = designLowPass(ask);
  const meets = demand.stops.every(
    (stop) =>
      rejectionAt(prototype, family, stop.edgeRad, stopEdgeRad, rejectionDb) >=
      stop.rejectionDb - ROUNDING_DB,
  );
  if (!meets) return null;
  const filter = rotateFilter(prototype, centreRad);
  const complement = () => complementOf(ask, filter, centreRad);
  return { family, order, rippleDb, rejectionDb, passEdgeRad, stopEdgeRad, filter, complement };
}

/** What a low-pass rejects from `edgeRad` on: its equiripple level beyond its own stop edge, monotone before it. */
function rejectionAt(
  filter: LabelledFilter,
  family: Family,
  edgeRad: number,
  stopEdgeRad: number,
  rejectionDb: number,
): number {
  const equiripple = family === 'ELLIPTIC' || family === 'CHEBYSHEV_II';
  const here = -10 * Math.log10(Math.max(transmissionAt(filter, edgeRad), 1e-30));
  return equiripple && edgeRad >= stopEdgeRad ? rejectionDb : here;
}

/**
 * The power-symmetric half-band filter, where the demand is symmetric enough for it: the least odd order up to
 * `maxOrder` (or `order`). Chips whose arms differ by one unit delay realise nothing else.
 */
export function halfBandCandidateOf(
  demand: OneBandDemand,
  family: Family,
  order: number | null,
  maxOrder: number,
): Candidate | null {
  if (family !== 'ELLIPTIC' && family !== 'BUTTERWORTH') return null;
  const stopEdgeRad = Math.min(demand.stops[0]!.edgeRad, Math.PI - demand.passEdgeRad);
  if (stopEdgeRad <= Math.PI / 2) return null;
  const needed = Math.max(
    ...demand.stops.map((stop) => stop.rejectionDb),
    isolationOfRipple(demand.rippleDb),
  );
  for (let odd = 1; odd <= Math.min(maxOrder, MAX_DESIGN_ORDER); odd += 2) {
    const isolationDb = halfBandIsolationDb(family, odd, stopEdgeRad);
    if ((order !== null && odd !== order) || isolationDb < needed - ROUNDING_DB) continue;
    const prototype = designHalfBand({
      family,
      order: odd,
      ...(family === 'ELLIPTIC' ? { stopEdgeRad } : {}),
    });
    const rippleDb = isolationOfRipple(isolationDb);
    const filter = rotateFilter(prototype, demand.centreRad);
    return {
      family,
      order: odd,
      rippleDb,
      rejectionDb: isolationDb,
      passEdgeRad: Math.PI - stopEdgeRad,
      stopEdgeRad,
      filter,
      complement: () => complementOfHalfBand(filter),
    };
  }
  return null;
}

/** Isolation A and ripple r of a power-symmetric pair: 10^(−A/10) + 10^(−r/10) = 1, either from the other. */
function isolationOfRipple(levelDb: number): number {
  return (-10 * Math.log1p(-(10 ** (-levelDb / 10)))) / Math.LN10;
}
