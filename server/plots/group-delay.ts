/** Group delay against frequency. */
import { curveName, curveScales, frequencyAxisTitle, pointsOf, type SpectrumPlot } from './curves.ts';
import { LOOK, PLOT_HEIGHT, PLOT_WIDTH } from './look.ts';
import { renderSvg } from './render.ts';

/**
 * `curves[].values`: group delay in ps; null where it is not defined (in the dark of a stopband), which leaves a gap.
 * @throws RangeError when a curve and the grid differ in length.
 */
export async function groupDelayPlot(plot: SpectrumPlot): Promise<string> {
  const left = plot.offsetGhz[0]!;
  const right = plot.offsetGhz[plot.offsetGhz.length - 1]!;
  const scales = curveScales(plot.curves);
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
          scale: { zero: true, nice: true },
        },
        color: { field: 'curve', type: 'nominal', scale: scales.color },
        strokeDash: { field: 'curve', type: 'nominal', scale: scales.strokeDash },
      },
      config: LOOK,
    },
    {
      title: plot.title,
      description: `Group delay in ps from ${left} to ${right} GHz around ${plot.referenceFrequencyThz} THz. Curves: ${plot.curves.map(curveName).join('; ')}. Gaps: not defined where next to no light passes.`,
    },
  );
}
