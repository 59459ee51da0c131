/** Transmission against frequency, with the mask it is judged by. */
import type { MaskSpecification, OutputPort } from '../../src/filter/index.ts';
import { curveName, curveScales, frequencyAxisTitle, pointsOf, type SpectrumPlot } from './curves.ts';
import { COLOURS, LOOK, PLOT_HEIGHT, PLOT_WIDTH } from './look.ts';
import { type ForbiddenGround, type Frame, forbiddenGround, type WordsPlace } from './mask.ts';
import { type Layer, renderSvg } from './render.ts';

/** `curves[].values`: transmission in dB against the light sent in. */
export interface TransmissionPlot extends SpectrumPlot {
  readonly mask?: MaskSpecification;
  readonly fsrGhz: number;
}

/** Below the deepest demand, or below the peak where nothing is demanded, this much is shown. */
const DEPTH_BELOW_DEMAND_DB = 30;
const DEPTH_BELOW_PEAK_DB = 80;
const ROOM_ABOVE_DB = 3;
const GROUND_OPACITY = 0.13;

function extreme(values: Iterable<number | null>, pick: (a: number, b: number) => number): number | null {
  let best: number | null = null;
  for (const value of values)
    if (value !== null && Number.isFinite(value)) best = best === null ? value : pick(best, value);
  return best;
}

/** The judged curve comes first: the peak of an output is that of its first curve. */
function peakOf(plot: TransmissionPlot, output: OutputPort): number | null {
  const curve = plot.curves.find((candidate) => candidate.output === output);
  return curve === undefined ? null : extreme(Array.from(curve.values), Math.max);
}

function frameOf(plot: TransmissionPlot): Frame {
  const all = plot.curves.flatMap(({ values }) => Array.from(values));
  const peak = extreme(all, Math.max) ?? 0;
  const lowest = extreme(all, Math.min) ?? peak;
  const reference = plot.mask?.reference === 'PEAK' ? peak : 0;
  const demands = (plot.mask?.bands ?? []).flatMap(({ minTransmissionDb, maxTransmissionDb }) =>
    [minTransmissionDb, maxTransmissionDb].filter((demand) => demand !== undefined),
  );
  const deepest =
    demands.length > 0 ? reference + Math.min(...demands) - DEPTH_BELOW_DEMAND_DB : Number.POSITIVE_INFINITY;
  const bottom = Math.min(deepest, Math.max(lowest, peak - DEPTH_BELOW_PEAK_DB));
  return {
    left: plot.offsetGhz[0]!,
    right: plot.offsetGhz[plot.offsetGhz.length - 1]!,
    topDb: Math.max(peak, 0) + ROOM_ABOVE_DB,
    bottomDb: Math.floor((bottom - 1) / 10) * 10,
  };
}

const WORDS: Readonly<Record<WordsPlace, object>> = {
  ALONG: { align: 'center' },
  RIGHT: { align: 'left', dx: 6 },
  LEFT: { align: 'right', dx: -6 },
  UPWARDS: { angle: 270, align: 'right', dx: -7 },
};

function wordLayer(grounds: readonly ForbiddenGround[], place: WordsPlace, above: boolean): Layer {
  const apart = place === 'ALONG' ? { dy: above ? -9 : 10 } : {};
  return {
    data: { values: grounds.filter((ground) => ground.place === place && ground.above === above) },
    mark: {
      type: 'text',
      fontSize: 11,
      baseline: 'middle',
      clip: true,
      color: COLOURS.ink,
      ...WORDS[place],
      ...apart,
    },
    encoding: {
      x: { field: 'wordsAt', type: 'quantitative' },
      y: { field: 'demandDb', type: 'quantitative' },
      text: { field: 'words', type: 'nominal' },
    },
  };
}

/** Ground in the colour of the output that must not enter it, with its demand as a firm edge. */
function groundLayers(grounds: readonly ForbiddenGround[], colour: string): Layer[] {
  const values = grounds.filter((ground) => ground.colour === colour);
  const across = { x: { field: 'from', type: 'quantitative' }, x2: { field: 'to' } } as const;
  return [
    {
      data: { values },
      mark: { type: 'rect', color: colour, opacity: GROUND_OPACITY, clip: true },
      encoding: { ...across, y: { field: 'low', type: 'quantitative' }, y2: { field: 'high' } },
    },
    {
      data: { values },
      mark: { type: 'rule', color: colour, strokeWidth: 2.25, clip: true },
      encoding: { ...across, y: { field: 'demandDb', type: 'quantitative' } },
    },
  ];
}

function describe(plot: TransmissionPlot, frame: Frame, grounds: readonly ForbiddenGround[]): string {
  const demands = [...new Set(grounds.map(({ words }) => words))];
  return [
    `Transmission in dB from ${frame.left} to ${frame.right} GHz around ${plot.referenceFrequencyThz} THz.`,
    `Curves: ${plot.curves.map(curveName).join('; ')}.`,
    demands.length > 0 ? `Demands, shaded where they are broken: ${demands.join('; ')}.` : 'No demands.',
  ].join(' ');
}

/**
 * @returns SVG. Curves are drawn in the order given; dB below the frame is cut off at its edge.
 * @throws RangeError when a curve and the grid differ in length.
 */
export async function transmissionPlot(plot: TransmissionPlot): Promise<string> {
  const frame = frameOf(plot);
  const grounds =
    plot.mask === undefined
      ? []
      : forbiddenGround(plot.mask, plot.fsrGhz, frame, (output) => peakOf(plot, output));
  const scales = curveScales(plot.curves);
  const curves: Layer = {
    // Points below the frame stay in: the line leaves the frame instead of ending.
    data: { values: pointsOf(plot) },
    mark: {
      type: 'line',
      clip: true,
      strokeJoin: 'round',
      strokeWidth: 1.75,
      invalid: 'break-paths-show-path-domains',
    },
    encoding: {
      x: {
        field: 'offset',
        type: 'quantitative',
        title: frequencyAxisTitle(plot.referenceFrequencyThz),
        scale: { domain: [frame.left, frame.right], nice: false },
        axis: { tickCount: 10 },
      },
      y: {
        field: 'value',
        type: 'quantitative',
        title: 'Transmission, dB',
        scale: { domain: [frame.bottomDb, frame.topDb], nice: false },
      },
      color: { field: 'curve', type: 'nominal', scale: scales.color },
      strokeDash: { field: 'curve', type: 'nominal', scale: scales.strokeDash },
    },
  };
  const layer = [
    ...groundLayers(grounds, COLOURS.out1),
    ...groundLayers(grounds, COLOURS.out2),
    curves,
    ...(['ALONG', 'RIGHT', 'LEFT', 'UPWARDS'] as const).flatMap((place) => [
      wordLayer(grounds, place, true),
      wordLayer(grounds, place, false),
    ]),
  ];
  return renderSvg(
    {
      width: PLOT_WIDTH,
      height: PLOT_HEIGHT,
      title: { text: plot.title, ...(plot.subtitle === undefined ? {} : { subtitle: plot.subtitle }) },
      layer,
      config: LOOK,
    },
    { title: plot.title, description: describe(plot, frame, grounds) },
  );
}
