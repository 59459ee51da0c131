import { cascadeCostDb, pairPoles, type TransferFunction, toSections } from '../filter/index.ts';

/** What the exact mirrored sections of a filter lose as a passive cascade, dB: closed form, nothing is placed. */
export function exactCascadeLossDb(filter: TransferFunction, centreRad: number): number {
  return cascadeCostDb(toSections(filter, pairPoles(filter, centreRad)));
}
