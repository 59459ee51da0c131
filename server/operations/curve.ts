/** A curve of a design on the grid asked for, as the wire tells it. */
import type { z } from 'zod';
import { inUnit, offsetGhzOf } from '../../schema/offsets.ts';
import type { curveAskRule } from '../../schema/response.ts';
import { type GridInput, type Span, unitOf } from '../../schema/units.ts';
import type { ChipModel } from '../../src/chip/index.ts';
import { FLOOR_DB, NM_THZ } from '../../src/conventions.ts';
import { curveOf, type Design, type DesignCurve } from '../../src/design/index.ts';
import { reduceTo } from '../../src/response/index.ts';
import type { Curve } from './operations.ts';

/** Points of a curve whose grid is not given: 0.05 % of the free spectral range apart. */
const DEFAULT_POINTS = 2_001;

/** Why group delay and dispersion are missing; the core leaves them out for this reason alone. */
const GAP_REASON = 'more than 60 dB below the peak, where the phase says nothing about the delay';

/** The two ends exactly, everything between equidistant. */
function equidistant(first: number, last: number, points: number): Float64Array {
  const step = (last - first) / (points - 1);
  return Float64Array.from({ length: points }, (_, i) => (i === points - 1 ? last : first + i * step));
}

/**
 * Ascending offsets of a grid. A grid in nm is equidistant in nm; its distances from the first line are formed by
 * c·(λ₀−λ)/(λ·λ₀), because the difference of two absolute frequencies loses digits.
 */
function offsetsOfGrid(grid: GridInput | undefined, chip: ChipModel): Float64Array {
  if (grid === undefined) return equidistant(-chip.fsrGhz / 2, chip.fsrGhz / 2, DEFAULT_POINTS);
  const [unit, { start, stop, points }] = unitOf<Span>(grid);
  const first = offsetGhzOf(start, unit, chip);
  if (unit !== 'wavelengthNm') return equidistant(first, offsetGhzOf(stop, unit, chip), points);
  const ghzFromFirst = (wavelengthNm: number) =>
    (NM_THZ * (start - wavelengthNm) * 1e3) / (wavelengthNm * start);
  return equidistant(start, stop, points)
    .map((wavelengthNm) => first + ghzFromFirst(wavelengthNm))
    .reverse();
}

/** Indices of the points kept: least and greatest transmission of each stretch. */
function keptPoints(curve: DesignCurve, points: number | undefined): number[] | null {
  const all = curve.transmissionDb.length;
  if (points === undefined || all <= points) return null;
  const indices = Float64Array.from({ length: all }, (_, i) => i);
  return [...reduceTo(indices, curve.transmissionDb, points).x];
}

function gapsIn(groupDelayPs: readonly (number | null)[]): Curve['gaps'] {
  const gaps: { from: number; to: number; reason: string }[] = [];
  groupDelayPs.forEach((delay, i) => {
    if (delay !== null) return;
    const last = gaps.at(-1);
    if (last !== undefined && last.to === i - 1) last.to = i;
    else gaps.push({ from: i, to: i, reason: GAP_REASON });
  });
  return gaps;
}

const finiteOrNull = (value: number): number | null => (Number.isFinite(value) ? value : null);

/** Cost: points × rings, and as much again for the wire's lists. */
export function curveOfDesign(design: Design, chip: ChipModel, ask: z.infer<typeof curveAskRule>): Curve {
  const { stage = 'SETTING', output = 'OUT1' } = ask;
  const curve = curveOf(design, chip, stage, output, offsetsOfGrid(ask.grid, chip));
  const kept = keptPoints(curve, ask.reduceTo);
  const list = (values: Float64Array): number[] =>
    kept === null ? [...values] : kept.map((i) => values[i]!);
  const offsetGhz = list(curve.spectrum.offsetGhz);
  const groupDelayPs = list(curve.spectrum.groupDelayPs).map(finiteOrNull);
  return {
    stage,
    output,
    frequencyThz: offsetGhz.map((offset) => inUnit(offset, 'frequencyThz', chip)),
    wavelengthNm: offsetGhz.map((offset) => inUnit(offset, 'wavelengthNm', chip)),
    offsetGhz,
    field: { re: list(curve.spectrum.re), im: list(curve.spectrum.im) },
    transmissionDb: list(curve.transmissionDb),
    floorDb: FLOOR_DB,
    phaseRad: list(curve.phaseRad),
    groupDelayPs,
    dispersionPsPerNm: list(curve.dispersionPsPerNm).map(finiteOrNull),
    gaps: gapsIn(groupDelayPs),
    reduced: kept !== null,
  };
}
