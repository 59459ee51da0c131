/** What closed forms alone can say about a question: fast enough to answer while somebody types. */
import type { ChipModel } from '../chip/index.ts';
import { type FamilyPlans, planFilters } from '../filter/index.ts';
import { capacityOf, refuseBelowFloor, refuseCascadeOnBoth } from './capacity.ts';
import type { DesignQuestion } from './design.ts';

export interface QuestionCheck {
  /** Least order that answers the question, over the families asked for. */
  readonly order: number;
  /** Rings that it takes. */
  readonly rings: number;
}

/** @throws Refusal for everything that needs no synthesis to refuse. Cost: milliseconds. */
export function checkQuestion(question: DesignQuestion, chip: ChipModel): QuestionCheck {
  const families = plansFor(question, chip);
  const order = Math.min(...families.flatMap(({ plans }) => plans.map((plan) => plan.order)));
  return { order, rings: order };
}

/** Every filter that closed forms allow on this chip. @throws Refusal */
export function plansFor(question: DesignQuestion, chip: ChipModel): FamilyPlans[] {
  const { specification, synthesis } = question;
  refuseBelowFloor(specification, chip);
  refuseCascadeOnBoth(question);
  return planFilters(specification, chip.fsrGhz, capacityOf(chip, specification, synthesis.architecture));
}
