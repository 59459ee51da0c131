/** From a transfer function to circuits: the all-pass pair and the cascade of sections. */
export { type RealisedPair, synthesiseAllPassPair } from './all-pass-pair.ts';
export type { CascadeOptions } from './cascade-options.ts';
export { type CellLosses, refuseUndercoupled, withLosses } from './interferometer.ts';
export type { CascadeGoal, OmegaBand, OmegaMask } from './mask-problem.ts';
export { type OptimisedCascade, optimiseCascade, refineCascade } from './optimise-cascade.ts';
export { sectionOf } from './section.ts';
export {
  type CascadeCell,
  circuitOfCascade,
  productOf,
  type SectionCascade,
  sectionCount,
  synthesiseSectionCascade,
} from './section-cascade.ts';
export { cascadeTradeOff, type PassbandAsk, passbandMask, type TradeOffPoint } from './trade-off.ts';
