/** From a specification to the filters that answer it, or the reason why none does. */
import { Refusal } from '../../errors.ts';
import type { FamilySpecification, FilterSpecification } from '../specification.ts';
import { planFamily } from './family-plan.ts';
import { planInterleaver } from './interleaver-plan.ts';
import { planMask } from './mask-plan.ts';
import type { Capacity, FamilyPlans } from './plan.ts';

export { type Capacity, type FamilyPlans, type FilterPlan, MAX_DESIGN_ORDER } from './plan.ts';

/**
 * All filters worth trying, by family, cheapest first. The family form gives exactly one. Throws `Refusal` where
 * closed forms decide: contradictions, collisions across the FSR, passivity, order, rings. Milliseconds.
 */
export function planFilters(
  specification: FilterSpecification,
  fsrGhz: number,
  capacity: Capacity,
): FamilyPlans[] {
  if (specification.mask) {
    const { mask } = specification;
    refuseOrderOutOfRange(mask.order, capacity, '/specification/mask/order');
    return about('/specification/mask', () => planMask(mask, fsrGhz, capacity));
  }
  return about('/specification/family', () => planFamilyForm(specification.family, fsrGhz, capacity));
}

/** The filter core knows no members of a request: what it refuses by itself is about the specification as a whole. */
function about(pointer: string, plan: () => FamilyPlans[]): FamilyPlans[] {
  try {
    return plan();
  } catch (error) {
    if (!(error instanceof Refusal) || error.details.pointer !== undefined) throw error;
    const { given: _, ...details } = error.details;
    throw new Refusal({ ...details, pointer });
  }
}

function planFamilyForm(spec: FamilySpecification, fsrGhz: number, capacity: Capacity): FamilyPlans[] {
  refuseOrderOutOfRange(spec.order, capacity, '/specification/family/order');
  const plan =
    spec.shape === 'INTERLEAVER'
      ? planInterleaver(spec, fsrGhz, capacity)
      : planFamily(spec, fsrGhz, capacity);
  return [{ family: plan.family, leastOrder: plan.order, plans: [plan] }];
}

function refuseOrderOutOfRange(order: number | undefined, capacity: Capacity, pointer: string): void {
  if (order === undefined || (Number.isInteger(order) && order >= 1)) return;
  throw new Refusal({
    code: 'SPECIFICATION_INVALID',
    limit: 'ORDER',
    detail: 'The order is a whole number from 1 on.',
    pointer,
    given: order,
    allowed: { min: 1, max: capacity.order },
    nearest: [{ reason: 'order 1', changes: [{ pointer, given: order, works: 1 }] }],
  });
}
