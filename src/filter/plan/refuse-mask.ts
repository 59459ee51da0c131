/** A mask that no family meets within the order there is: which demand would be met instead. */
import { type Change, Refusal, type Suggestion } from '../../errors.ts';
import { reachableRejectionDb, reachableStopEdgeRad } from '../order.ts';
import type { Family, MaskSpecification } from '../specification.ts';
import { foldRad, insideHalfTurn } from './circle.ts';
import type { MaskDemand, OwnBand } from './demand.ts';
import { type Capacity, FAMILIES, type FamilyPlans } from './plan.ts';
import { describeCapacity, describeOrder, typedRejectionDb } from './refuse-order.ts';

const TURN = 2 * Math.PI;

/** Suggested edges are moved outward to a multiple of this share of the FSR. */
const EDGE_STEP_FSR = 1e-4;

export function refuseMaskOrder(
  mask: MaskSpecification,
  understood: MaskDemand,
  tried: readonly FamilyPlans[],
  capacity: Capacity,
  fsrGhz: number,
): never {
  const needed = Math.min(...tried.map((one) => one.leastOrder ?? Number.POSITIVE_INFINITY));
  const most = Math.min(capacity.order, mask.order ?? capacity.order);
  const limit = mask.order !== undefined && mask.order <= capacity.order ? 'ORDER' : capacity.limit;
  const asked =
    mask.order !== undefined && mask.order > capacity.order ? `Order ${mask.order} is asked for; the` : 'The';
  const strictest = understood.own
    .filter((band) => band.kind === 'STOP')
    .reduce((a, b) => (b.levelDb > a.levelDb ? b : a));
  throw new Refusal({
    code: 'SPECIFICATION_UNREACHABLE',
    limit,
    detail: `${asked} mask needs ${describeOrder(needed)} (${mask.family ?? 'the best of the four families'}); ${describeCapacity({ ...capacity, order: most, limit })}.`,
    pointer:
      mask.order === undefined ? `/specification/mask/bands/${strictest.index}` : '/specification/mask/order',
    given: mask.order ?? mask.bands[strictest.index]!.maxTransmissionDb ?? null,
    allowed: { maxOrder: capacity.order },
    nearest: most < 1 ? [] : suggestions(mask, understood, most, needed, capacity, fsrGhz),
  });
}

function suggestions(
  mask: MaskSpecification,
  understood: MaskDemand,
  most: number,
  needed: number,
  capacity: Capacity,
  fsrGhz: number,
): Suggestion[] {
  const order: Change[] =
    mask.order !== undefined && mask.order > most
      ? [{ pointer: '/specification/mask/order', given: mask.order, works: most }]
      : [];
  const list: Suggestion[] = [];
  if (mask.order !== undefined && needed <= capacity.order) {
    list.push({
      reason: `order ${needed}`,
      changes: [{ pointer: '/specification/mask/order', given: mask.order, works: needed }],
    });
  }
  const { family, rejectionDb } = bestReach(understood, mask.family ? [mask.family] : FAMILIES, most);
  const typed = typedRejectionDb(rejectionDb, understood.demand.rippleDb);
  const less = typed === null ? null : lessRejection(mask, understood, typed);
  if (less && less.length > 0)
    list.push({ reason: 'the same edges, less rejection', changes: [...less, ...order] });
  const { passEdgeRad, rippleDb, stops } = understood.demand;
  const strictestDb = Math.max(...stops.map((stop) => stop.rejectionDb));
  const edgeRad = reachableStopEdgeRad(family, most, { passEdgeRad, rippleDb, rejectionDb: strictestDb });
  const wider =
    edgeRad + EDGE_STEP_FSR * TURN > insideHalfTurn(Math.PI, passEdgeRad)
      ? null
      : widerTransition(mask, understood, edgeRad, fsrGhz);
  if (wider) list.push({ reason: 'the same rejection, a wider transition', changes: [...wider, ...order] });
  return list;
}

/** Every stopband lowered to what is reachable; null where the demand stands on the other output. */
function lessRejection(mask: MaskSpecification, understood: MaskDemand, typedDb: number): Change[] | null {
  const stopped = understood.own.filter((band) => band.kind === 'STOP' && band.levelDb > typedDb);
  if (stopped.some((band) => mask.bands[band.index]!.output !== understood.output)) return null;
  return stopped.map((band) => ({
    pointer: `/specification/mask/bands/${band.index}/maxTransmissionDb`,
    given: mask.bands[band.index]!.maxTransmissionDb,
    works: -typedDb,
    unit: 'dB',
  }));
}

/** Stopband edges moved away from the passband to `edgeRad`; null when a band would vanish. */
function widerTransition(
  mask: MaskSpecification,
  understood: MaskDemand,
  edgeRad: number,
  fsrGhz: number,
): Change[] | null {
  const changes: Change[] = [];
  for (const band of understood.own.filter((one) => one.kind === 'STOP')) {
    const moved = movedEdges(band, understood.demand.centreRad, edgeRad, fsrGhz);
    if (moved === null) continue;
    const given = mask.bands[band.index]!;
    const works = { lowGhz: given.lowGhz + moved.lowGhz, highGhz: given.highGhz - moved.highGhz };
    if (works.lowGhz > works.highGhz || given.output !== understood.output) return null;
    changes.push({
      pointer: `/specification/mask/bands/${band.index}/interval`,
      given: { lowGhz: given.lowGhz, highGhz: given.highGhz },
      works,
      unit: 'GHz',
    });
  }
  return changes.length > 0 ? changes : null;
}

function movedEdges(
  band: OwnBand,
  centreRad: number,
  edgeRad: number,
  fsrGhz: number,
): { lowGhz: number; highGhz: number } | null {
  const low = foldRad(band.arc.startRad - centreRad);
  const high = TURN - (low + band.arc.lengthRad);
  const step = EDGE_STEP_FSR * fsrGhz;
  const move = (distance: number): number =>
    distance >= edgeRad ? 0 : Math.ceil(((edgeRad - distance) * fsrGhz) / TURN / step + 1e-6) * step;
  const moved = { lowGhz: move(low), highGhz: move(high) };
  return moved.lowGhz === 0 && moved.highGhz === 0 ? null : moved;
}

/** The greatest rejection any of `families` reaches from the nearest stop edge on with `order`. */
function bestReach(
  understood: MaskDemand,
  families: readonly Family[],
  order: number,
): { family: Family; rejectionDb: number } {
  const { passEdgeRad, rippleDb, stops } = understood.demand;
  const reach = families.map((family) => ({
    family,
    rejectionDb: reachableRejectionDb(family, order, {
      passEdgeRad,
      rippleDb,
      stopEdgeRad: stops[0]!.edgeRad,
    }),
  }));
  return reach.reduce((best, one) => (one.rejectionDb > best.rejectionDb ? one : best));
}
