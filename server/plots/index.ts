/** Plots as SVG documents. */
export type { PlotCurve, SpectrumPlot } from './curves.ts';
export { groupDelayPlot } from './group-delay.ts';
export { type PlanePoint, type PoleZeroPlot, poleZeroPlot } from './pole-zero.ts';
export { type TransmissionPlot, transmissionPlot } from './transmission.ts';
