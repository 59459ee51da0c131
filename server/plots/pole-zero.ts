/** Poles and zeros in the z plane. The unit circle is one free spectral range, walked once around. */
import { COLOURS, LOOK } from './look.ts';
import { type Layer, renderSvg } from './render.ts';

export interface PlanePoint {
  readonly re: number;
  readonly im: number;
}

export interface PoleZeroPlot {
  readonly title: string;
  readonly subtitle?: string;
  readonly poles: readonly PlanePoint[];
  readonly zeros: readonly PlanePoint[];
  /** Labels the circle with offsets from the reference frequency. */
  readonly fsrGhz: number;
}

const SIZE = 440;
/** Room around the unit circle, for its labels. */
const LEAST_RADIUS = 1.45;
/** Zeros far out would shrink the circle to a dot; those beyond are counted in the subtitle instead. */
const GREATEST_RADIUS = 2.5;
/** Nearer than this two points are drawn as one with their number: a fifth of a pixel. */
const SAME_POINT = 1e-3;
const CROSS = 'M-0.9,-0.9L0.9,0.9M-0.9,0.9L0.9,-0.9';

interface Mark extends PlanePoint {
  readonly count: number;
  readonly label: string;
}

function gathered(points: readonly PlanePoint[]): Mark[] {
  const groups: PlanePoint[][] = [];
  for (const point of points) {
    const group = groups.find(
      ([first]) => Math.hypot(first!.re - point.re, first!.im - point.im) < SAME_POINT,
    );
    if (group === undefined) groups.push([point]);
    else group.push(point);
  }
  return groups.map((group) => {
    const label = group.length > 1 ? `\u00d7${group.length}` : '';
    return { re: group[0]!.re, im: group[0]!.im, count: group.length, label };
  });
}

function circle(): { re: number; im: number; step: number }[] {
  return Array.from({ length: 181 }, (_, step) => {
    const angle = (step / 180) * 2 * Math.PI;
    return { re: Math.cos(angle), im: Math.sin(angle), step };
  });
}

/** Ω = 2π·offset/FSR is the angle on the circle. */
function circleLabels(fsrGhz: number): { re: number; im: number; text: string }[] {
  const quarter = Number((fsrGhz / 4).toPrecision(6));
  const half = Number((fsrGhz / 2).toPrecision(6));
  return [
    { re: 1.23, im: 0, text: '0 GHz' },
    { re: 0, im: 1.1, text: `+${quarter} GHz` },
    { re: -1.23, im: 0, text: `\u00b1${half} GHz` },
    { re: 0, im: -1.1, text: `\u2212${quarter} GHz` },
  ];
}

const x = (domain: [number, number]) =>
  ({ field: 're', type: 'quantitative', title: 'Re z', scale: { domain, nice: false } }) as const;
const y = (domain: [number, number]) =>
  ({ field: 'im', type: 'quantitative', title: 'Im z', scale: { domain, nice: false } }) as const;

function layersOf(plot: PoleZeroPlot, radius: number, inside: (point: PlanePoint) => boolean): Layer[] {
  const at = { x: x([-radius, radius]), y: y([-radius, radius]) };
  const poles = gathered(plot.poles.filter(inside)).map((mark) => ({ ...mark, kind: 'pole' }));
  const zeros = gathered(plot.zeros.filter(inside)).map((mark) => ({ ...mark, kind: 'zero' }));
  const domain = ['pole', 'zero'];
  return [
    {
      data: { values: circle() },
      mark: { type: 'line', color: COLOURS.faint, strokeWidth: 1.25 },
      encoding: { ...at, order: { field: 'step', type: 'quantitative' } },
    },
    {
      data: { values: circleLabels(plot.fsrGhz) },
      mark: { type: 'text', fontSize: 11, color: COLOURS.faint },
      encoding: { ...at, text: { field: 'text', type: 'nominal' } },
    },
    {
      data: { values: [...zeros, ...poles] },
      mark: { type: 'point', size: 130, strokeWidth: 2, filled: false, opacity: 1, clip: true },
      encoding: {
        ...at,
        shape: {
          field: 'kind',
          type: 'nominal',
          scale: { domain, range: [CROSS, 'circle'] },
          legend: { symbolSize: 130 },
        },
        color: { field: 'kind', type: 'nominal', scale: { domain, range: [COLOURS.out1, COLOURS.out2] } },
      },
    },
    {
      data: { values: [...zeros, ...poles].filter(({ count }) => count > 1) },
      mark: { type: 'text', fontSize: 12, dx: 12, dy: -10, color: COLOURS.ink },
      encoding: { ...at, text: { field: 'label', type: 'nominal' } },
    },
  ];
}

/** @returns SVG, of equal scale in both directions. */
export async function poleZeroPlot(plot: PoleZeroPlot): Promise<string> {
  const size = ({ re, im }: PlanePoint): number => Math.hypot(re, im);
  const all = [...plot.poles, ...plot.zeros].filter((point) => size(point) <= GREATEST_RADIUS);
  const radius = Math.max(LEAST_RADIUS, ...all.map((point) => size(point) * 1.12));
  const inside = (point: PlanePoint): boolean => size(point) <= GREATEST_RADIUS;
  const beyond = plot.zeros.filter((point) => !inside(point));
  const farthest = Math.max(0, ...beyond.map(size));
  const note =
    beyond.length === 0
      ? undefined
      : `${beyond.length} zero${beyond.length > 1 ? 's' : ''} outside the frame, up to |z| = ${farthest.toPrecision(3)}`;
  const subtitle = [plot.subtitle, note].filter((line) => line !== undefined);
  const layer: Layer[] = layersOf(plot, radius, inside);
  return renderSvg(
    {
      width: SIZE,
      height: SIZE,
      title: { text: plot.title, ...(subtitle.length === 0 ? {} : { subtitle }) },
      layer,
      config: LOOK,
    },
    {
      title: plot.title,
      description: `${plot.poles.length} poles (crosses) and ${plot.zeros.length} zeros (circles) in the z plane with the unit circle, which spans one free spectral range of ${plot.fsrGhz} GHz.${note === undefined ? '' : ` ${note}.`}`,
    },
  );
}
