/** The real chip: what it holds, how a circuit is placed on it, which currents make it so, and what they make of it. */
export { type RingCapacity, ringCapacity } from './capacity.ts';
export { STANDING_CAUTIONS } from './cautions.ts';
export { type CouplerState, couplerAt, innerCouplings, thetaForCoupling } from './coupler.ts';
export { type ChipElement, type ElementKind, listElements } from './elements.ts';
export { type FitOptions, fitToChip, type IdealCircuit } from './fit.ts';
export { withChipLosses } from './lossy.ts';
export type * from './model.ts';
export { type Carried, type PlacedCell, type PlacedCircuit, type PlacedRing, withCircuit } from './placed.ts';
export type * from './setting.ts';
export { circuitOfSetting } from './simulate-setting.ts';
export { solveSetting } from './solve-setting.ts';
