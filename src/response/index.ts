/** Responses: curves, figures and mask compliance of one output of a circuit or of a transfer function. */
export { complianceOf } from './compliance.ts';
export { type FigureBands, figuresOf } from './figures.ts';
export { type ReducedCurve, reduceTo } from './reduce.ts';
export type { BandCompliance, Compliance, Figures, Quantity, Spectrum, Stage } from './response.ts';
export { type Feature, type FieldSource, sourceOfCircuit, sourceOfTransferFunction } from './source.ts';
export { dispersionPsPerNm, gapsOf, phaseRad, spectrumOf, transmissionDb } from './spectrum.ts';
export { powerExtremes, toDb } from './transmission.ts';
