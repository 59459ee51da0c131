/** The refusals of placing a circuit on a chip. */
import { Refusal } from '../errors.ts';
import type { Coupler } from './model.ts';

export function tooFewRings(detail: string, given: unknown, allowed: unknown): Refusal {
  return new Refusal({ code: 'SPECIFICATION_UNREACHABLE', limit: 'RINGS', detail, given, allowed });
}

/**
 * `element` is a path such as `cell1.ring2.coupling`. The nearest value within reach is in the text, and by how much this
 * kind of coupler may miss what is wanted, where it may.
 */
export function outOfReach(
  element: string,
  powerCrossCoupling: number,
  coupler: Coupler,
  allowedMiss = 0,
): Refusal {
  const { minCoupling: min, maxCoupling: max } = coupler;
  const nearest = Math.min(max, Math.max(min, powerCrossCoupling));
  const reach = coupler.tunable ? `reaches ${min} to ${max}` : `is fixed at ${min}`;
  const beyond =
    allowedMiss > 0
      ? ` A miss of up to ${allowedMiss} would be taken, and its effect on the nulls told.`
      : '';
  return new Refusal({
    code: 'SPECIFICATION_UNREACHABLE',
    limit: 'COUPLING_RANGE',
    detail: `${element} would have to be ${powerCrossCoupling.toPrecision(6)}; it ${reach}, nearest ${nearest}.${beyond}`,
    element,
    given: powerCrossCoupling,
    allowed: { min, max },
  });
}

export function undercoupled(element: string, powerCrossCoupling: number, least: number): Refusal {
  return new Refusal({
    code: 'SPECIFICATION_UNREACHABLE',
    limit: 'COUPLING_RANGE',
    detail:
      `${element} would have to be ${powerCrossCoupling.toPrecision(6)}; with the loss of one turn of this chip's ` +
      `rings a ring is an all-pass only above ${least.toPrecision(6)}.`,
    element,
    given: powerCrossCoupling,
    allowed: { above: least },
  });
}

/** Of several candidates' refusals the one that came furthest: a coupling out of reach means that the rings did suffice. */
export function furthest(refusals: readonly Refusal[]): Refusal {
  return refusals.find((refusal) => refusal.details.limit !== 'RINGS') ?? refusals[0]!;
}
