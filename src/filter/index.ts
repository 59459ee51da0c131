/** From what is asked to zeros and poles: families, bands, orders, sections, the split into all-pass arms. */

export { type AllPassPair, decompose } from './allpass.ts';
export { type BandAsk, designHighPass, designLowPass, rotateFilter } from './bands.ts';
export { complementOf, complementOfHalfBand } from './complement.ts';
export { evaluateInto, groupDelayInto, transmissionAt } from './evaluate.ts';
export { analogPrototype, type PrototypeAsk } from './families.ts';
export { MAX_ORDER } from './guards.ts';
export {
  designHalfBand,
  type HalfBandFamily,
  halfBandIsolationDb,
  halfBandStopEdgeRad,
  leastHalfBandOrder,
} from './half-band.ts';
export { designMirroredBandPass, designMirroredBandStop } from './mirrored-bands.ts';
export {
  butterworthEdgeRad,
  designEdges,
  type LowPassDemand,
  leastOrder,
  naturalStopEdgeRad,
  reachablePassEdgeRad,
  reachableRejectionDb,
  reachableRippleDb,
  reachableStopEdgeRad,
} from './order.ts';
export { allPairings, mirroredPairings, type Pairing, pairPoles } from './pairing.ts';
export { findPeak } from './peak.ts';
export {
  type Capacity,
  type FamilyPlans,
  type FilterPlan,
  MAX_DESIGN_ORDER,
  planFilters,
} from './plan/index.ts';
export { cascadeCostDb, passiveSection, toSections } from './sections.ts';
export type * from './specification.ts';
export type * from './transfer-function.ts';
