/** What closed forms alone can say about a question: fast enough to answer while somebody types. */
import type { ChipModel } from '../chip/index.ts';
import { planFilters } from '../filter/index.ts';
import { capacityOf, refuseBelowFloor } from './capacity.ts';
import type { DesignQuestion } from './design.ts';

export interface QuestionCheck {
  /** Least order that answers the question, over the families asked for. */
  readonly order: number;
  /** Rings that it takes. */
  readonly rings: number;
}

/** @throws Refusal for everything that needs no synthesis to refuse. Cost: milliseconds. */
export function checkQuestion({ specification, synthesis }: DesignQuestion, chip: ChipModel): QuestionCheck {
  refuseBelowFloor(specification, chip);
  const families = planFilters(specification, chip.fsrGhz, capacityOf(chip, synthesis.architecture));
  const order = Math.min(...families.flatMap(({ plans }) => plans.map((plan) => plan.order)));
  return { order, rings: order };
}
