/** The curves of a plot: what the plotter takes, how it thins them and how it tells them apart. */
import { NM_THZ } from '../../src/conventions.ts';
import type { OutputPort } from '../../src/filter/index.ts';
import type { Stage } from '../../src/response/index.ts';
import { COLOURS, PLOT_WIDTH } from './look.ts';

/** One curve: `values` belongs to the plot's `offsetGhz`; null and NaN leave a gap. */
export interface PlotCurve {
  readonly stage: Stage;
  readonly output: OutputPort;
  readonly values: ArrayLike<number | null>;
}

/** What every plot over frequency takes. */
export interface SpectrumPlot {
  /** First line: which chip, which design. */
  readonly title: string;
  readonly subtitle?: string;
  /** Ascending, GHz from the chip's reference frequency. */
  readonly offsetGhz: ArrayLike<number>;
  readonly referenceFrequencyThz: number;
  readonly curves: readonly PlotCurve[];
}

/** `curve` is the legend's entry. */
export interface CurvePoint {
  readonly curve: string;
  readonly offset: number;
  readonly value: number | null;
}

/** One bucket, so two points, a pixel of the drawing. */
const BUCKETS = PLOT_WIDTH;

const STAGE_WORDS: Readonly<Record<Stage, string>> = {
  TARGET: 'target',
  CIRCUIT: 'lossless circuit',
  CHIP: 'with loss',
  SETTING: 'as set',
};

const STAGE_DASHES: Readonly<Record<Stage, readonly number[]>> = {
  SETTING: [],
  TARGET: [5, 4],
  CHIP: [2, 3],
  CIRCUIT: [9, 3, 2, 3],
};

export function outputWords(output: OutputPort): string {
  return output === 'OUT1' ? 'out 1' : 'out 2';
}

export function colourOf(output: OutputPort): string {
  return output === 'OUT1' ? COLOURS.out1 : COLOURS.out2;
}

export function curveName({ output, stage }: PlotCurve): string {
  return `${outputWords(output)}, ${STAGE_WORDS[stage]}`;
}

function finite(value: number | null | undefined): number | null {
  return value === null || value === undefined || !Number.isFinite(value) ? null : value;
}

/** Of every bucket the least and the greatest point, in order: a notch one sample wide survives. Gaps survive too. */
function thinnedIndices(values: ArrayLike<number | null>): number[] {
  const count = values.length;
  if (count <= 2 * BUCKETS) return Array.from({ length: count }, (_, i) => i);
  const kept = new Set<number>([0, count - 1]);
  for (let bucket = 0; bucket < BUCKETS; bucket++) {
    const from = Math.floor((bucket * count) / BUCKETS);
    const to = Math.floor(((bucket + 1) * count) / BUCKETS);
    let least = -1;
    let greatest = -1;
    for (let i = from; i < to; i++) {
      const value = finite(values[i]);
      if (value === null) kept.add(i);
      else {
        if (least < 0 || value < finite(values[least])!) least = i;
        if (greatest < 0 || value > finite(values[greatest])!) greatest = i;
      }
    }
    if (least >= 0) kept.add(least).add(greatest);
  }
  return [...kept].sort((a, b) => a - b);
}

/** @throws RangeError when a curve and the grid differ in length. */
export function pointsOf(plot: SpectrumPlot): CurvePoint[] {
  return plot.curves.flatMap((curve) => {
    if (curve.values.length !== plot.offsetGhz.length)
      throw new RangeError('a curve needs one value a grid point');
    const name = curveName(curve);
    return thinnedIndices(curve.values).map((i) => ({
      curve: name,
      offset: plot.offsetGhz[i]!,
      value: finite(curve.values[i]),
    }));
  });
}

/** Colour and dash of every curve, for scales that share one legend. */
export function curveScales(curves: readonly PlotCurve[]) {
  const domain = curves.map(curveName);
  return {
    color: { domain, range: curves.map(({ output }) => colourOf(output)) },
    strokeDash: { domain, range: curves.map(({ stage }) => [...STAGE_DASHES[stage]]) },
  };
}

/** `Offset from 193.1 THz (1552.5244 nm), GHz`: vacuum wavelength. */
export function frequencyAxisTitle(referenceFrequencyThz: number): string {
  const wavelengthNm = NM_THZ / referenceFrequencyThz;
  return `Offset from ${referenceFrequencyThz} THz (${wavelengthNm.toFixed(4)} nm in vacuum), GHz`;
}
