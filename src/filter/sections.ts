/** A filter as a product of sections of first and second order, and what a cascade of passive sections costs. */
import { Complex } from 'complex.js';
import type { Pairing } from './pairing.ts';
import { findPeak } from './peak.ts';
import type { FilterSection, TransferFunction } from './transfer-function.ts';

const decibels = (transmission: number): number => 10 * Math.log10(transmission);

/**
 * The sections of a pairing. Their product is the filter, gain and phase included; the gain is shared out so that
 * all sections have the same peak, and the phase of it is the first section's. Passive sections have no peak above
 * 0 dB: `cascadeCostDb` is what a cascade of them loses against the filter. O(400) a section.
 */
export function toSections(filter: TransferFunction, pairing: Pairing): FilterSection[] {
  const bare = pairing.map((roots) => ({
    zeros: roots.zeros.map((index) => filter.zeros[index]!),
    poles: roots.poles.map((index) => filter.poles[index]!),
    gain: new Complex(1, 0),
  }));
  const peaksDb = bare.map((section) => decibels(findPeak(section).transmission));
  const gainDb = 20 * Math.log10(filter.gain.abs());
  const peakDb = (gainDb + peaksDb.reduce((sum, peak) => sum + peak, 0)) / bare.length;
  return bare.map((section, index) => {
    const magnitude = 10 ** ((peakDb - peaksDb[index]!) / 20);
    const gain = index === 0 ? filter.gain.div(filter.gain.abs()).mul(magnitude) : new Complex(magnitude, 0);
    return { zeros: section.zeros, poles: section.poles, gain, peakDb };
  });
}

/** The section scaled to a peak of 0 dB, as a passive circuit must have it. */
export const passiveSection = (section: FilterSection): FilterSection => ({
  ...section,
  gain: section.gain.mul(10 ** (-section.peakDb / 20)),
  peakDb: 0,
});

/** Loss, dB ≥ 0 for a filter of peak 1, of the cascade of these sections made passive. */
export const cascadeCostDb = (sections: readonly FilterSection[]): number =>
  sections.reduce((sum, section) => sum + section.peakDb, 0);
