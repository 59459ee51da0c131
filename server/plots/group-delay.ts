/** Group delay against frequency. */
import { curveName, curveScales, frequencyAxisTitle, pointsOf, type SpectrumPlot } from './curves.ts';
import { LOOK, PLOT_HEIGHT, PLOT_WIDTH } from './look.ts';
import { renderSvg } from './render.ts';

/** Room below and above what the passbands show, as a share of it. */
const ROOM = 0.25;

/** `passes`: where on the grid the filter passes. There the delay matters; beside a null it runs off to anything. */
export interface DelayPlot extends SpectrumPlot {
  readonly passes?: (offsetGhz: number) => boolean;
}

/** The range of the delay in the passbands, 0 included; undefined where none is stated: the whole range then. */
function passbandRange({ curves, offsetGhz, passes }: DelayPlot): [number, number] | undefined {
  if (passes === undefined) return undefined;
  let low = 0;
  let high = 0;
  for (let i = 0; i < offsetGhz.length; i++) {
    if (!passes(offsetGhz[i]!)) continue;
    for (const { values } of curves) {
      const value = values[i];
      if (value === null || value === undefined || !Number.isFinite(value)) continue;
      low = Math.min(low, value);
      high = Math.max(high, value);
    }
  }
  return high > low ? [low - (low < 0 ? ROOM * (high - low) : 0), high + ROOM * (high - low)] : undefined;
}

/**
 * `curves[].values`: group delay in ps; null where it is not defined (in the dark of a stopband), which leaves a gap.
 * @throws RangeError when a curve and the grid differ in length.
 */
export async function groupDelayPlot(plot: DelayPlot): Promise<string> {
  const left = plot.offsetGhz[0]!;
  const right = plot.offsetGhz[plot.offsetGhz.length - 1]!;
  const scales = curveScales(plot.curves);
  const domain = passbandRange(plot);
  return renderSvg(
    {
      width: PLOT_WIDTH,
      height: PLOT_HEIGHT,
      title: { text: plot.title, ...(plot.subtitle === undefined ? {} : { subtitle: plot.subtitle }) },
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
          scale: { domain: [left, right], nice: false },
          axis: { tickCount: 10 },
        },
        y: {
          field: 'value',
          type: 'quantitative',
          title: 'Group delay, ps',
          scale: { zero: true, nice: true, ...(domain === undefined ? {} : { domain }) },
        },
        color: { field: 'curve', type: 'nominal', scale: scales.color },
        strokeDash: { field: 'curve', type: 'nominal', scale: scales.strokeDash },
      },
      config: LOOK,
    },
    {
      title: plot.title,
      description: `Group delay in ps from ${left} to ${right} GHz around ${plot.referenceFrequencyThz} THz. Curves: ${plot.curves.map(curveName).join('; ')}. Gaps: not defined where next to no light passes.${domain === undefined ? '' : ' The axis ends with what the passbands need.'}`,
    },
  );
}
