/** "It needs more order than there is": with the figure that would do instead, checked by the same closed forms. */
import { HALF_POWER_DB } from '../../conventions.ts';
import { type Change, Refusal, type Suggestion } from '../../errors.ts';
import { reachableRejectionDb, reachableStopEdgeRad } from '../order.ts';
import type { FamilySpecification, IntervalGhz } from '../specification.ts';
import { foldGhz, insideHalfTurn } from './circle.ts';
import type { FamilyGeometry } from './family-demand.ts';
import { type Capacity, MAX_DESIGN_ORDER } from './plan.ts';

const TURN = 2 * Math.PI;
const AT = '/specification/family';

/** Suggested rejections are rounded down to this, suggested edges outward to this share of the FSR. */
const REJECTION_STEP_DB = 0.1;
const EDGE_STEP_FSR = 1e-4;

export function describeOrder(order: number): string {
  return Number.isFinite(order) ? `order ${order}` : `an order beyond ${MAX_DESIGN_ORDER}`;
}

export function describeCapacity(capacity: Capacity): string {
  if (capacity.order < 1)
    return 'this chip holds none: its arms and rings fit no filter of one unit delay a pole';
  return capacity.limit === 'RINGS'
    ? `the chip's rings make order ${capacity.order} at the most`
    : `order ${capacity.order} is what there is`;
}

/** Rounds a reachable rejection down to what is worth typing; null when nothing is left above the ripple. */
export function typedRejectionDb(reachDb: number, rippleDb: number): number | null {
  const typed = Math.floor((Math.min(reachDb, 200) - 1e-9) / REJECTION_STEP_DB) / (1 / REJECTION_STEP_DB);
  return typed > rippleDb ? Number(typed.toFixed(1)) : null;
}

export function refuseOrder(
  spec: FamilySpecification,
  geometry: FamilyGeometry,
  order: number,
  capacity: Capacity,
  fsrGhz: number,
): never {
  const asked = spec.rejectionDb !== undefined && spec.stopband;
  const given = spec.order === undefined ? (spec.rejectionDb ?? null) : spec.order;
  throw new Refusal({
    code: 'SPECIFICATION_UNREACHABLE',
    limit: capacity.limit,
    detail: `This ${spec.family} filter needs ${describeOrder(order)}; ${describeCapacity(capacity)}.`,
    pointer: spec.order === undefined ? `${AT}/rejectionDb` : `${AT}/order`,
    given,
    allowed:
      spec.order === undefined || capacity.order < 1
        ? { maxOrder: capacity.order }
        : { min: 1, max: capacity.order },
    nearest:
      asked && geometry.stopEdgeRad !== null
        ? easier(spec, geometry, order, capacity, fsrGhz)
        : lowerOrder(spec, capacity),
  });
}

function lowerOrder(spec: FamilySpecification, capacity: Capacity): Suggestion[] {
  if (capacity.order < 1) return [];
  return [
    {
      reason: `order ${capacity.order}`,
      changes: [{ pointer: `${AT}/order`, given: spec.order ?? null, works: capacity.order }],
    },
  ];
}

function easier(
  spec: FamilySpecification,
  geometry: FamilyGeometry,
  needed: number,
  capacity: Capacity,
  fsrGhz: number,
): Suggestion[] {
  if (capacity.order < 1) return [];
  const order: Change[] =
    spec.order !== undefined && spec.order > capacity.order
      ? [{ pointer: `${AT}/order`, given: spec.order, works: capacity.order }]
      : [];
  const rippleDb = spec.family === 'BUTTERWORTH' ? HALF_POWER_DB : spec.rippleDb!;
  const edges = { passEdgeRad: geometry.bandEdgeRad, rippleDb };
  const suggestions: Suggestion[] = [];
  if (
    spec.order !== undefined &&
    spec.order < needed &&
    capacity.limit === 'ORDER' &&
    needed <= MAX_DESIGN_ORDER
  ) {
    suggestions.push({
      reason: `order ${needed}`,
      changes: [{ pointer: `${AT}/order`, given: spec.order, works: needed }],
    });
  }
  const typed = typedRejectionDb(
    reachableRejectionDb(spec.family, capacity.order, { ...edges, stopEdgeRad: geometry.stopEdgeRad! }),
    rippleDb,
  );
  if (typed !== null && typed < spec.rejectionDb!) {
    suggestions.push({
      reason: 'the same edges, less rejection',
      changes: [
        { pointer: `${AT}/rejectionDb`, given: spec.rejectionDb, works: typed, unit: 'dB' },
        ...order,
      ],
    });
  }
  const stopEdgeRad = reachableStopEdgeRad(spec.family, capacity.order, {
    ...edges,
    rejectionDb: spec.rejectionDb!,
  });
  const works = stopIntervalGhz(geometry.centreRad, stopEdgeRad, spec.stopband!, fsrGhz);
  const hasWidth = stopEdgeRad + EDGE_STEP_FSR * TURN < insideHalfTurn(Math.PI, geometry.bandEdgeRad);
  if (works && hasWidth)
    suggestions.push({
      reason: 'the same rejection, a wider transition',
      changes: [{ pointer: `${AT}/stopband`, given: spec.stopband, works, unit: 'GHz' }, ...order],
    });
  return suggestions;
}

/** Everything further than `stopEdgeRad` from the centre, written near the interval that was asked for. */
function stopIntervalGhz(
  centreRad: number,
  stopEdgeRad: number,
  asked: IntervalGhz,
  fsrGhz: number,
): IntervalGhz | null {
  const step = EDGE_STEP_FSR * fsrGhz;
  const halfGhz = Math.floor((((Math.PI - stopEdgeRad) * fsrGhz) / TURN - 1e-9 * fsrGhz) / step) * step;
  if (!(halfGhz > step)) return null;
  const middle = ((centreRad + Math.PI) * fsrGhz) / TURN;
  const askedMiddle = (asked.lowGhz + asked.highGhz) / 2;
  const near = askedMiddle + foldGhz(middle - askedMiddle, fsrGhz);
  return {
    lowGhz: Number((near - halfGhz).toPrecision(12)),
    highGhz: Number((near + halfGhz).toPrecision(12)),
  };
}

/** A stopband that begins where the passband has not ended. */
export function refuseNoRoom(spec: FamilySpecification, geometry: FamilyGeometry, fsrGhz: number): never {
  const middle = geometry.bandEdgeRad + (Math.PI - geometry.bandEdgeRad) / 2;
  const works = stopIntervalGhz(geometry.centreRad, middle, spec.stopband!, fsrGhz);
  throw new Refusal({
    code: 'SPECIFICATION_INVALID',
    limit: 'FREE_SPECTRAL_RANGE',
    detail:
      'The stopband reaches into what the filter must pass (both taken modulo the free spectral range, beyond which the response repeats).',
    pointer: `${AT}/stopband`,
    given: spec.stopband,
    allowed: 'an interval that lies, modulo the free spectral range, outside the passband',
    ...(works
      ? {
          nearest: [
            {
              reason: 'a stopband from the middle of the transition on',
              changes: [{ pointer: `${AT}/stopband`, given: spec.stopband, works, unit: 'GHz' }],
            },
          ],
        }
      : {}),
  });
}
