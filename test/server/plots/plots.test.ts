/** What is drawn is checked by reading the picture back and comparing places with places, not with stored pictures. */
import { describe, expect, it } from 'vitest';
import {
  groupDelayPlot,
  type PlotCurve,
  poleZeroPlot,
  type TransmissionPlot,
  transmissionPlot,
} from '../../../server/plots/index.ts';
import { assertWellFormed, attribute, marks, runsOf, translation } from './svg.ts';

/** Coordinates are written with two decimals. */
const PIXEL_TOLERANCE = 0.02;

const grid = (points: number, from = -25, to = 25): Float64Array =>
  Float64Array.from({ length: points }, (_, i) => from + ((to - from) * i) / (points - 1));

const curve = (values: ArrayLike<number | null>, more: Partial<PlotCurve> = {}): PlotCurve => ({
  stage: 'SETTING',
  output: 'OUT1',
  values,
  ...more,
});

const plot = (more: Partial<TransmissionPlot> = {}): TransmissionPlot => ({
  title: 'A filter',
  offsetGhz: grid(101),
  referenceFrequencyThz: 193.1,
  fsrGhz: 50,
  curves: [curve(new Float64Array(101).fill(-20))],
  ...more,
});

const curvesOf = (svg: string) => marks(svg, 'line mark').map((element) => runsOf(attribute(element, 'd')));

describe('every plot', () => {
  const draw = () =>
    Promise.all([
      transmissionPlot(plot({ title: 'a <b> & "c" </title><script>', subtitle: 'x < y' })),
      groupDelayPlot({ ...plot(), title: 'delay' }),
      poleZeroPlot({ title: 'plane', poles: [{ re: 0.5, im: 0 }], zeros: [{ re: -1, im: 0 }], fsrGhz: 50 }),
    ]);

  it('is well-formed, holds its own title and description, and fetches and runs nothing', async () => {
    for (const svg of await draw()) {
      assertWellFormed(svg);
      expect(svg).toMatch(
        /^<\?xml[^>]*>\n<svg [^>]*role="img" aria-labelledby="plot-title plot-description">/,
      );
      expect(svg).toMatch(
        /<title id="plot-title">[^<]+<\/title><desc id="plot-description">[^<]{40,}<\/desc>/,
      );
      expect(svg).not.toMatch(/<(script|image|use|foreignObject|a|style)\b|@import|(href|src)=/);
      expect(svg.replaceAll('http://www.w3.org/', '')).not.toMatch(/https?:/);
    }
  });

  it('is the same, to the byte, however often and in whatever company it is drawn', async () => {
    const [first, second] = [await draw(), await draw()];
    expect(second).toEqual(first);
  });

  it('has a delay axis for the passbands, however far the delay runs off beside a null', async () => {
    const offsetGhz = grid(101);
    const values = offsetGhz.map((offset) => (Math.abs(offset) < 2 ? -800 : 20));
    const delay = { title: 'delay', offsetGhz, referenceFrequencyThz: 193.1, curves: [curve(values)] };
    const whole = await groupDelayPlot(delay);
    const passing = await groupDelayPlot({ ...delay, passes: (offset) => Math.abs(offset) > 5 });
    expect(whole).toContain('>\u2212800<');
    expect(passing).not.toContain('>\u2212800<');
    expect(passing).toContain('>20<');
  });

  it('refuses a curve that is not as long as its grid', async () => {
    const broken = plot({ curves: [curve([1, 2, 3])] });
    await expect(transmissionPlot(broken)).rejects.toThrow(RangeError);
    await expect(groupDelayPlot(broken)).rejects.toThrow(RangeError);
  });
});

describe('the transmission plot', () => {
  it('draws a demand at the height of a curve that just meets it', async () => {
    const svg = await transmissionPlot(
      plot({
        mask: {
          reference: 'INPUT',
          bands: [{ lowGhz: -5, highGhz: 5, maxTransmissionDb: -20, output: 'OUT1' }],
        },
      }),
    );
    const [[run]] = curvesOf(svg) as [[{ x: number; y: number }[]]];
    const [rule] = marks(svg, 'rule mark');
    expect(Math.abs(translation(rule!).y - run![0]!.y)).toBeLessThan(PIXEL_TOLERANCE);
    // 10 of 50 GHz in the middle of the frame.
    const width = run!.at(-1)!.x - run![0]!.x;
    expect(Math.abs(Number(attribute(rule!, 'x2')))).toBeCloseTo(width / 5, 1);
  });

  it('counts demands relative to the peak from the peak of their output', async () => {
    const mask = {
      reference: 'PEAK' as const,
      bands: [{ lowGhz: -5, highGhz: 5, minTransmissionDb: 0, output: 'OUT2' as const }],
    };
    const svg = await transmissionPlot(
      plot({ mask, curves: [curve(new Float64Array(101).fill(-20), { output: 'OUT2' })] }),
    );
    const y = curvesOf(svg)[0]![0]![0]!.y;
    expect(Math.abs(translation(marks(svg, 'rule mark')[0]!).y - y)).toBeLessThan(PIXEL_TOLERANCE);
  });

  it('draws a band that lies whole free spectral ranges away, and both images of one that straddles the edge', async () => {
    const image = async (lowGhz: number, highGhz: number): Promise<number> => {
      const bands = [{ lowGhz, highGhz, maxTransmissionDb: -30, output: 'OUT1' as const }];
      return marks(await transmissionPlot(plot({ mask: { reference: 'INPUT', bands } })), 'rule mark').length;
    };
    expect(await image(101, 104)).toBe(1);
    expect(await image(20, 30)).toBe(2);
  });

  it('keeps a notch that is one sample of 20,001 wide', async () => {
    const values = new Float64Array(20_001).fill(-1);
    values[12_345] = -47;
    const svg = await transmissionPlot(plot({ offsetGhz: grid(20_001), curves: [curve(values)] }));
    const points = curvesOf(svg)[0]!.flat();
    const lowest = points.reduce((a, b) => (b.y > a.y ? b : a));
    const width = points.at(-1)!.x - points[0]!.x;
    expect(lowest.x / width).toBeCloseTo(12_345 / 20_000, 4);
    expect(points.length).toBeLessThan(2_000);
    // Between the axis's own labels: −1 dB and −47 dB stand 46 dB apart.
    const labels = [
      ...svg.matchAll(/<text text-anchor="end" transform="translate\(-[\d.]+,([\d.]+)\)"[^>]*>([−\d]+)</g),
    ];
    const [upper, lower] = [labels[0]!, labels.at(-1)!].map(([, y, text]) => ({
      y: Number(y),
      db: Number(text!.replace('−', '-')),
    }));
    const pixelsPerDb = (upper!.y - lower!.y) / (lower!.db - upper!.db);
    expect((lowest.y - points[0]!.y) / pixelsPerDb).toBeCloseTo(46, 0);
  });

  it('tells every curve by name in its legend, and outputs from stages', async () => {
    const flat = new Float64Array(101).fill(-3);
    const svg = await transmissionPlot(
      plot({
        curves: [
          curve(flat),
          curve(flat, { output: 'OUT2' }),
          curve(flat, { stage: 'TARGET' }),
          curve(flat, { stage: 'TARGET', output: 'OUT2' }),
        ],
      }),
    );
    for (const name of ['out 1, as set', 'out 2, as set', 'out 1, target', 'out 2, target'])
      expect(svg.split(`>${name}<`)).toHaveLength(2);
    const lines = marks(svg, 'line mark');
    expect(new Set(lines.map((line) => attribute(line, 'stroke'))).size).toBe(2);
    expect(lines.filter((line) => / stroke-dasharray="\d/.test(line))).toHaveLength(2);
    expect(svg).toContain('Offset from 193.1 THz (1552.5244 nm in vacuum), GHz');
  });
});

describe('the group-delay plot', () => {
  it('leaves a gap where the delay is not defined, null or NaN', async () => {
    const values = Array.from({ length: 101 }, (_, i): number | null => (i > 40 && i < 50 ? null : 20));
    values[80] = Number.NaN;
    const svg = await groupDelayPlot({ ...plot(), curves: [curve(values)] });
    expect(curvesOf(svg)[0]).toHaveLength(3);
  });
});

describe('the pole-zero plot', () => {
  const at = (svg: string, kind: string) =>
    marks(svg, 'point')
      .filter((element) => element.includes(`kind: ${kind}`))
      .map(translation);

  it('draws the unit circle round, with poles and zeros where they are', async () => {
    const svg = await poleZeroPlot({
      title: 'plane',
      poles: [{ re: 0.5, im: -0.25 }],
      zeros: [{ re: -1, im: 0 }],
      fsrGhz: 50,
    });
    const circle = curvesOf(svg)[0]![0]!;
    const [xs, ys] = [circle.map(({ x }) => x), circle.map(({ y }) => y)];
    const radius = (Math.max(...xs) - Math.min(...xs)) / 2;
    expect((Math.max(...ys) - Math.min(...ys)) / 2).toBeCloseTo(radius, 1);
    const centre = { x: Math.max(...xs) - radius, y: Math.max(...ys) - radius };
    const [pole] = at(svg, 'pole');
    expect((pole!.x - centre.x) / radius).toBeCloseTo(0.5, 3);
    expect((centre.y - pole!.y) / radius).toBeCloseTo(-0.25, 3);
    expect((at(svg, 'zero')[0]!.x - centre.x) / radius).toBeCloseTo(-1, 3);
  });

  it('labels the circle with offsets: a quarter turn is a quarter of the free spectral range', async () => {
    const svg = await poleZeroPlot({ title: 'plane', poles: [], zeros: [], fsrGhz: 100 });
    for (const label of ['0 GHz', '+25 GHz', '±50 GHz', '−25 GHz']) expect(svg).toContain(`>${label}<`);
  });

  it('gathers roots on one spot, with their number, and counts those outside the frame', async () => {
    const svg = await poleZeroPlot({
      title: 'plane',
      poles: [{ re: 0.1, im: 0 }],
      zeros: [...Array.from({ length: 4 }, () => ({ re: -1, im: 0 })), { re: 40, im: 0 }],
      fsrGhz: 50,
    });
    expect(at(svg, 'zero')).toHaveLength(1);
    expect(svg).toContain('>×4<');
    expect(svg).toContain('1 zero outside the frame, up to |z| = 40.0');
  });
});
