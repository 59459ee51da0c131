/** What no filter design can be asked for; everything past these guards may assume sound numbers. */
import type { Complex } from 'complex.js';
import { type LimitKind, Refusal } from '../errors.ts';
import type { PrototypeAsk } from './families.ts';

/** Beyond this a double no longer holds the poles of the narrow bands that make such an order worth asking for. */
export const MAX_ORDER = 32;

/** Below this a ripple's factor, above this a rejection's factor, leaves the range in which the formulas were checked. */
export const MIN_RIPPLE_DB = 1e-9;
const MAX_REJECTION_DB = 300;

function refuse(detail: string, given: unknown, allowed: unknown, limit?: LimitKind): never {
  throw new Refusal({ code: 'SPECIFICATION_INVALID', detail, given, allowed, ...(limit ? { limit } : {}) });
}

export function guardOrder(order: number): void {
  if (Number.isInteger(order) && order >= 1 && order <= MAX_ORDER) return;
  refuse(
    `The order must be a whole number from 1 to ${MAX_ORDER}.`,
    order,
    { min: 1, max: MAX_ORDER },
    'ORDER',
  );
}

/** A demand that needs an order beyond what is designed. */
export function guardReach(order: number, demand: unknown): void {
  if (order <= MAX_ORDER) return;
  throw new Refusal({
    code: 'SPECIFICATION_UNREACHABLE',
    detail: `This needs order ${order}; designs go up to order ${MAX_ORDER}.`,
    given: demand,
    allowed: { maxOrder: MAX_ORDER },
    limit: 'ORDER',
  });
}

/** `edgeRad` in the open interval (0, π). */
export function guardEdge(edgeRad: number): void {
  if (edgeRad > 0 && edgeRad < Math.PI) return;
  const detail = 'A band edge must lie between the centre and half a free spectral range from it.';
  refuse(detail, edgeRad, 'an edge between the two', 'FREE_SPECTRAL_RANGE');
}

export function guardRipple(rippleDb: number | undefined): asserts rippleDb is number {
  if (rippleDb !== undefined && rippleDb >= MIN_RIPPLE_DB && rippleDb < MAX_REJECTION_DB) return;
  refuse(`The ripple must lie between ${MIN_RIPPLE_DB} and ${MAX_REJECTION_DB} dB.`, rippleDb ?? null, {
    min: MIN_RIPPLE_DB,
    below: MAX_REJECTION_DB,
  });
}

export function guardRejection(rejectionDb: number | undefined): asserts rejectionDb is number {
  if (rejectionDb !== undefined && rejectionDb > 0 && rejectionDb <= MAX_REJECTION_DB) return;
  refuse('The rejection must be a number of dB above 0.', rejectionDb ?? null, {
    above: 0,
    max: MAX_REJECTION_DB,
  });
}

/** A stopband above the passband's ripple is not a filter. */
export function guardContrast(rippleDb: number, rejectionDb: number): void {
  if (rejectionDb > rippleDb) return;
  refuse('The rejection must be greater than the ripple.', rejectionDb, { above: rippleDb });
}

/** Nearer than this to the unit circle a pole's rounding alone moves the response by more than 1e-6. */
const LEAST_POLE_DISTANCE = 1e-10;

/** Refuses designs whose transition is so steep that their poles are lost in rounding. */
export function guardPoles(poles: readonly Complex[]): void {
  const nearest = Math.max(...poles.map((pole) => pole.abs()));
  if (1 - nearest >= LEAST_POLE_DISTANCE) return;
  throw new Refusal({
    code: 'SPECIFICATION_UNREACHABLE',
    detail:
      'The transition is so steep, or the band so narrow, that a ring would have to keep its light almost for ever.',
    given: { polePowerLoss: (1 - nearest) * (1 + nearest) },
    allowed: 'a wider band, or a wider transition',
    limit: 'COUPLING_RANGE',
  });
}

/** Guards order and the figures that the family uses. */
export function guardPrototype({ family, order, rippleDb, rejectionDb }: PrototypeAsk): void {
  guardOrder(order);
  if (family === 'CHEBYSHEV_I' || family === 'ELLIPTIC') guardRipple(rippleDb);
  if (family === 'CHEBYSHEV_II' || family === 'ELLIPTIC') guardRejection(rejectionDb);
  if (family === 'ELLIPTIC') guardContrast(rippleDb!, rejectionDb!);
}
