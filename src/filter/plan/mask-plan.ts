/** A mask as filters: every family (or the one asked for) at the least order that meets it, and one more. */
import type { Family, MaskSpecification } from '../specification.ts';
import { type Candidate, candidatesOf, halfBandCandidateOf, leastOrderOf } from './candidates.ts';
import { demandOfMask, type MaskDemand } from './demand.ts';
import { type Capacity, FAMILIES, type FamilyPlans, type FilterPlan } from './plan.ts';
import { refuseMaskOrder } from './refuse-mask.ts';

export function planMask(mask: MaskSpecification, fsrGhz: number, capacity: Capacity): FamilyPlans[] {
  const understood = demandOfMask(mask, fsrGhz);
  const families = mask.family ? [mask.family] : FAMILIES;
  const all = families.map((family) => plansOf(family, mask, understood, capacity));
  if (all.every((one) => one.plans.length === 0)) refuseMaskOrder(mask, understood, all, capacity, fsrGhz);
  return all;
}

function plansOf(
  family: Family,
  mask: MaskSpecification,
  understood: MaskDemand,
  capacity: Capacity,
): FamilyPlans {
  const { demand } = understood;
  const leastOrder = leastOrderOf(demand, family);
  const orders =
    mask.order !== undefined ? [mask.order] : leastOrder === null ? [] : [leastOrder, leastOrder + 1];
  const candidates = orders
    .filter((order) => order <= capacity.order)
    .flatMap((order) => candidatesOf(demand, family, order));
  const halfBand = halfBandCandidateOf(demand, family, mask.order ?? null, capacity.halfBandOrder);
  if (halfBand) candidates.push(halfBand);
  return { family, leastOrder, plans: candidates.map((candidate) => planOf(candidate, mask, understood)) };
}

function planOf(candidate: Candidate, mask: MaskSpecification, { demand, output }: MaskDemand): FilterPlan {
  return { ...candidate, output, centreRad: demand.centreRad, mask };
}
