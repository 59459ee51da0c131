/** From what is asked to zeros and poles: families, bands, orders, sections, the split into all-pass arms. */

export { type BandAsk, designHighPass, designLowPass, rotateFilter } from './bands.ts';
export { evaluateInto, groupDelayInto, transmissionAt } from './evaluate.ts';
export { type AnalogFilter, type AnalogPrototype, analogPrototype, type PrototypeAsk } from './families.ts';
export { designMirroredBandPass, designMirroredBandStop, type MirroredBandAsk } from './mirrored-bands.ts';
export type * from './specification.ts';
export type * from './transfer-function.ts';
