/** From a transfer function to circuits: the all-pass pair and the cascade of sections. */
export { type RealisedPair, synthesiseAllPassPair } from './all-pass-pair.ts';
export { type CellLosses, refuseUndercoupled, withLosses } from './interferometer.ts';
