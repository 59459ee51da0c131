/**
 * The order of passive sections. It leaves the response as it is; it decides how much light is on its way between cells:
 * how far above detector noise a tap between them is, and how much power a narrow ring must carry.
 *
 * Up to four sections every order is tried: the one whose weakest partial product has the strongest peak wins. Ties and
 * longer cascades follow L. B. Jackson, "Roundoff-noise analysis for fixed-point digital filters realized in cascade or
 * parallel form", IEEE Trans. Audio Electroacoust. AU-18, 107 (1970): sections in the order of rising peakedness, greatest
 * magnitude over root mean square, so that the narrowest rings see light that is already filtered (from memory).
 */
import { evaluateInto, type FilterSection } from '../filter/index.ts';
import { circleGrid } from './peak.ts';

const ENUMERATED_SECTIONS = 4;
const GRID_POINTS = 512;

/** Peaks closer than this are one: below what a lab can measure. */
const SAME_PEAK_DB = 1e-3;

/** Added to |H|² so that an exact null stays finite in dB. */
const POWER_FLOOR = 1e-30;

export interface SectionOrder {
  /** Positions of the given sections in their new order. */
  readonly order: readonly number[];
  /** Peak of the product of the first one, two, … sections, dB. */
  readonly partialPeaksDb: readonly number[];
  /** Orders looked at. */
  readonly considered: number;
}

function permutations(count: number): number[][] {
  if (count === 0) return [[]];
  return permutations(count - 1).flatMap((rest) =>
    Array.from({ length: count }, (_, at) => [...rest.slice(0, at), count - 1, ...rest.slice(at)]),
  );
}

/** dB of a section on a grid. */
function decibels(section: FilterSection, grid: Float64Array): Float64Array {
  const re = new Float64Array(grid.length);
  const im = new Float64Array(grid.length);
  evaluateInto(section, grid, re, im);
  return re.map((value, k) => 10 * Math.log10(value * value + im[k]! * im[k]! + POWER_FLOOR));
}

function partialPeaks(order: readonly number[], curves: readonly Float64Array[]): number[] {
  const sum = new Float64Array(curves[0]!.length);
  return order.map((section) => {
    let peak = Number.NEGATIVE_INFINITY;
    curves[section]!.forEach((value, k) => {
      sum[k] = sum[k]! + value;
      peak = Math.max(peak, sum[k]!);
    });
    return peak;
  });
}

/** Greatest magnitude over root mean square on a uniform grid, dB. */
function peakedness(section: FilterSection, uniform: Float64Array): number {
  const curve = decibels(section, uniform);
  const mean = curve.reduce((sum, value) => sum + 10 ** (value / 10), 0) / curve.length;
  return section.peakDb - 10 * Math.log10(mean);
}

/** Orders a cascade of at least one section. */
export function orderSections(sections: readonly FilterSection[]): SectionOrder {
  const grid = circleGrid(
    sections.flatMap((section) => section.poles),
    GRID_POINTS,
  );
  const curves = sections.map((section) => decibels(section, grid));
  const uniform = circleGrid([], GRID_POINTS);
  const sharpness = sections.map((section) => peakedness(section, uniform));
  const rising = sections.map((_, k) => k).sort((a, b) => sharpness[a]! - sharpness[b]! || a - b);
  const tried = sections.length <= ENUMERATED_SECTIONS ? permutations(sections.length) : [];
  let order = rising;
  let peaks = partialPeaks(rising, curves);
  for (const candidate of tried) {
    const candidatePeaks = partialPeaks(candidate, curves);
    if (Math.min(...candidatePeaks.slice(0, -1)) > Math.min(...peaks.slice(0, -1)) + SAME_PEAK_DB) {
      order = candidate;
      peaks = candidatePeaks;
    }
  }
  return { order, partialPeaksDb: peaks, considered: Math.max(1, tried.length) };
}
