import { describe, expect, it } from 'vitest';
import type { ChipModel } from '../../src/chip/index.ts';
import {
  checkQuestion,
  computeDesign,
  curveOf,
  type Design,
  stageCompliance,
  stageFigures,
} from '../../src/design/index.ts';
import { Refusal } from '../../src/errors.ts';
import type { FilterSpecification, OutputPort } from '../../src/filter/index.ts';
import {
  bothGuidesChip,
  ideally,
  interleaverChip,
  sixRingChip,
  twoCellChip,
} from '../chip/invented-chips.ts';
import { circuitError, everyday, pass, stop } from './designs.ts';

/** The promise of the ideal circuit: largest absolute field error, seen by the general solver. */
const FIELD = 1e-9;
/** A driver step of 1e-12 mA, and the rounding of a hundred phases. */
const IDEAL_SETTING = 1e-6;
/** Demands met exactly at a steep edge: rounding of the edge itself. */
const EDGE_DB = 1e-4;
/** Two evaluations of the same figure from the same record. */
const AGAIN_DB = 1e-9;

/** Two searches from other starts, and driver steps: less than another goal makes (0.2 dB here). */
const FORETOLD_DB = 0.1;

const ask = (
  specification: FilterSpecification,
  chip: ChipModel,
  architecture?: 'ALL_PASS_PAIR' | 'SECTION_CASCADE',
): Design => computeDesign({ specification, synthesis: architecture ? { architecture } : {} }, chip);

const pump: FilterSpecification = {
  mask: { reference: 'INPUT', bands: [pass(-12, -10, -2), stop(-1, 1, -45), pass(10, 12, -2)] },
};

const interleaver: FilterSpecification = {
  family: {
    family: 'ELLIPTIC',
    shape: 'INTERLEAVER',
    centreGhz: 0,
    band: { lowGhz: -12, highGhz: 12 },
    rejectionDb: 25,
    rippleDb: 1,
    gridGhz: 50,
    output: 'OUT1',
  },
};

const cases: readonly (readonly [
  string,
  FilterSpecification,
  ChipModel,
  'ALL_PASS_PAIR' | 'SECTION_CASCADE',
])[] = [
  ['second-order Chebyshev II as a pair', everyday.chebyshevII(100, 'OUT2'), sixRingChip, 'ALL_PASS_PAIR'],
  [
    'second-order Chebyshev II as a section',
    everyday.chebyshevII(100, 'OUT2'),
    twoCellChip,
    'SECTION_CASCADE',
  ],
  ['fourth-order elliptic half-band as a pair', everyday.elliptic(100, 'OUT2'), sixRingChip, 'ALL_PASS_PAIR'],
  [
    'fourth-order elliptic half-band as a pair over two cells',
    everyday.elliptic(100, 'OUT2'),
    bothGuidesChip,
    'ALL_PASS_PAIR',
  ],
  [
    'fourth-order elliptic half-band as two sections',
    everyday.elliptic(100, 'OUT2'),
    twoCellChip,
    'SECTION_CASCADE',
  ],
  ['interleaver', interleaver, interleaverChip, 'ALL_PASS_PAIR'],
  ['pump rejection', pump, sixRingChip, 'ALL_PASS_PAIR'],
];

describe.each(cases)('%s', (_title, specification, chip, architecture) => {
  const design = ask(specification, chip, architecture);
  const outputs: OutputPort[] = ['OUT1', 'OUT2'];

  it('meets its transfer function on both outputs, seen by the general solver [cross-check]', () => {
    for (const output of outputs) expect(circuitError(design, chip, output)).toBeLessThan(FIELD);
  });

  it('is what its setting makes of the chip when nothing is lost and nothing rounded [property]', () => {
    const ideal = ideally(chip);
    const exact = ask(specification, ideal, architecture);
    const offsetGhz = Float64Array.from({ length: 301 }, (_, i) => (i / 300 - 0.5) * chip.fsrGhz);
    for (const output of outputs) {
      const set = curveOf(exact, ideal, 'SETTING', output, offsetGhz).spectrum;
      const circuit = curveOf(exact, ideal, 'CIRCUIT', output, offsetGhz).spectrum;
      set.re.forEach((_, i) => {
        const difference = Math.hypot(set.re[i]!, set.im[i]!) - Math.hypot(circuit.re[i]!, circuit.im[i]!);
        expect(Math.abs(difference)).toBeLessThan(IDEAL_SETTING);
      });
    }
  });

  it('never has more light at an output than was sent in [property]', () => {
    const offsetGhz = Float64Array.from({ length: 1001 }, (_, i) => (i / 1000 - 0.5) * chip.fsrGhz);
    for (const stage of ['CIRCUIT', 'CHIP', 'SETTING'] as const) {
      const [one, two] = outputs.map((output) => curveOf(design, chip, stage, output, offsetGhz).spectrum);
      one!.re.forEach((_, i) => {
        const power = one!.re[i]! ** 2 + one!.im[i]! ** 2 + two!.re[i]! ** 2 + two!.im[i]! ** 2;
        expect(power).toBeLessThan(1 + 1e-12);
      });
    }
  });

  it('records what recomputing its circuit and setting gives, also after JSON [regression]', () => {
    const stored = JSON.parse(JSON.stringify(design)) as Design;
    const compliance = stageCompliance(stored, chip, 'SETTING');
    expect(Math.abs(compliance.worstMarginDb - design.compliance.worstMarginDb)).toBeLessThan(AGAIN_DB);
    expect(stageFigures(stored, chip, 'SETTING', design.output)).toEqual(design.figures);
    expect(stored).toEqual(JSON.parse(JSON.stringify(ask(specification, chip, architecture))));
  });

  it('lists every channel once, within its limits and on the driver raster [property]', () => {
    expect(design.setting.channels.map((one) => one.channel)).toEqual(
      chip.channels.map((one) => one.channel),
    );
    design.setting.channels.forEach((one, i) => {
      const channel = chip.channels[i]!;
      const steps = one.currentMa / channel.resolutionMa;
      expect(Math.abs(steps - Math.round(steps))).toBeLessThan(1e-6);
      expect(one.currentMa).toBeLessThanOrEqual(one.limitMa + 1e-12);
    });
  });
});

describe('everyday requirements are kept by the lossless circuit', () => {
  const kept: readonly (readonly [
    string,
    FilterSpecification,
    ChipModel,
    'ALL_PASS_PAIR' | 'SECTION_CASCADE',
  ])[] = [
    [
      'Chebyshev II, 10 dB from 0.5π, as a pair',
      everyday.chebyshevII(100, 'OUT2'),
      sixRingChip,
      'ALL_PASS_PAIR',
    ],
    [
      'Chebyshev II, 10 dB from 0.5π, as a section',
      everyday.chebyshevII(100, 'OUT2'),
      twoCellChip,
      'SECTION_CASCADE',
    ],
    ['elliptic, 2 dB and 40 dB, as a pair', everyday.elliptic(100, 'OUT2'), sixRingChip, 'ALL_PASS_PAIR'],
    [
      'elliptic, 2 dB and 40 dB, as two sections',
      everyday.elliptic(100, 'OUT2'),
      twoCellChip,
      'SECTION_CASCADE',
    ],
  ];

  it.each(kept)(
    '%s [cross-check: common practice, no source]',
    (_title, specification, chip, architecture) => {
      const ideal = ideally(chip);
      const design = ask(specification, ideal, architecture);
      const { bands } = stageCompliance(design, ideal, 'CIRCUIT');
      const { rejectionDb, rippleDb, band } = specification.family!;
      const stopband = bands.find((one) => one.quantity === 'MAX_TRANSMISSION_DB')!;
      expect(stopband.demand).toBe(-rejectionDb!);
      expect(stopband.margin).toBeGreaterThan(-EDGE_DB);
      const passband = bands.find((one) => one.quantity === 'MIN_TRANSMISSION_DB')!;
      expect(passband.margin).toBeGreaterThan(-EDGE_DB);
      if (rippleDb !== undefined)
        expect([passband.demand, passband.band.highGhz]).toEqual([-rippleDb, band!.highGhz]);
      else expect(stopband.band.lowGhz).toBeCloseTo(band!.highGhz, 9);
    },
  );
});

describe('the choice', () => {
  it('takes the all-pass pair where it fits and says what the cascade would lose [cross-check]', () => {
    const design = ask(everyday.elliptic(100, 'OUT2'), sixRingChip);
    expect(design.architecture).toBe('ALL_PASS_PAIR');
    const cascade = design.alternatives.find((one) => one.architecture === 'SECTION_CASCADE');
    // 10.5 dB: the fourth-order half-band (2 dB, 40 dB) as two conjugate passive sections, an independent trial's figure.
    expect(cascade?.insertionLossDb).toBeCloseTo(10.5, 0);
  });

  it('offers the cheapest family that meets a mask, with the others compared', () => {
    const design = ask(pump, sixRingChip);
    expect(design.compliance.met).toBe(true);
    const met = design.alternatives.filter((one) => one.fits && (one.worstMarginDb ?? -1) >= 0);
    expect(design.order).toBe(Math.min(...met.map((one) => one.order)));
    expect(new Set(design.alternatives.map((one) => one.family)).size).toBe(4);
  });

  it('reports progress that never falls and ends at 1', () => {
    const told: number[] = [];
    computeDesign({ specification: pump, synthesis: {} }, sixRingChip, {
      onProgress: (part) => told.push(part),
    });
    expect(told.every((part, i) => i === 0 || part >= told[i - 1]!)).toBe(true);
    expect(told.at(-1)).toBe(1);
  });
});

describe('the cascade', () => {
  const room: FilterSpecification = {
    family: { ...everyday.elliptic(100, 'OUT2').family!, stopband: { lowGhz: 32, highGhz: 68 } },
  };

  it('loses little where the stop edge may move to 0.64π, lossless and at 0.5 dB a turn [cross-check]', () => {
    // Ideal 2.0 dB at 0.64π, found with NumPy and SciPy from many starts; a better one is welcome.
    const lossless = ask(room, ideally(twoCellChip), 'SECTION_CASCADE');
    expect(lossless.compliance.met).toBe(true);
    expect(lossless.figures.insertionLossDb).toBeLessThan(2.0 + 0.2);
    // At 0.5 dB a turn 42.7 dB are reachable with 14 dB of loss: 40 dB are asked.
    const lossy: ChipModel = {
      ...twoCellChip,
      losses: { unitDelayLossDb: 0.5, couplerExcessLossDb: 0, facetLossDb: 0 },
    };
    const design = ask(room, lossy, 'SECTION_CASCADE');
    expect(design.compliance.met).toBe(true);
    expect(design.figures.rejectionDb).toBeGreaterThan(40);
    expect(design.figures.rippleDb).toBeLessThan(2);
  });

  it('reports its loss against the stop edge, which never rises as the edge moves out [property]', () => {
    const { tradeOff, figures } = ask(room, twoCellChip, 'SECTION_CASCADE');
    expect(tradeOff.length).toBeGreaterThan(1);
    const losses = [figures.insertionLossDb!, ...tradeOff.map((point) => point.insertionLossDb!)];
    losses.slice(1).forEach((loss, i) => {
      expect(loss).toBeLessThanOrEqual(losses[i]! + 0.05);
    });
  });

  it.each(['INPUT', 'PEAK'] as const)(
    'trades loss against stop edge over the mask that was asked for, counted from %s [property]',
    (reference) => {
      const mask: FilterSpecification = {
        mask: { reference, bands: [pass(-20, 20, -3), stop(35, 65, -30)] },
      };
      const { tradeOff, figures } = ask(mask, twoCellChip, 'SECTION_CASCADE');
      expect(tradeOff.length).toBeGreaterThan(1);
      const losses = [figures.insertionLossDb!, ...tradeOff.map((point) => point.insertionLossDb!)];
      losses.slice(1).forEach((loss, i) => {
        expect(loss).toBeLessThanOrEqual(losses[i]! + 0.05);
      });
    },
  );

  it.each(['INPUT', 'PEAK'] as const)(
    'foretells what it loses when the further stop edge is then asked for, counted from %s [property]',
    (reference) => {
      const bandsFrom = (edge: number): FilterSpecification => ({
        mask: { reference, order: 3, bands: [pass(-20, 20, -3), stop(edge, 100 - edge, -30)] },
      });
      const [foretold] = ask(bandsFrom(35), twoCellChip, 'SECTION_CASCADE').tradeOff;
      const asked = ask(bandsFrom(foretold!.stopEdgeGhz), twoCellChip, 'SECTION_CASCADE');
      expect(Math.abs(asked.figures.insertionLossDb! - foretold!.insertionLossDb!)).toBeLessThan(FORETOLD_DB);
    },
  );

  it('is refused for a mask on both outputs', () => {
    expect(() => ask(interleaver, twoCellChip, 'SECTION_CASCADE')).toThrow(Refusal);
  });
});

describe('what is refused', () => {
  const refusal = (specification: FilterSpecification, chip: ChipModel): Refusal => {
    try {
      checkQuestion({ specification, synthesis: {} }, chip);
    } catch (error) {
      if (error instanceof Refusal) return error;
      throw error;
    }
    throw new Error('was not refused');
  };

  it('an order the chip has no rings for', () => {
    const order8: FilterSpecification = { family: { ...everyday.elliptic(100, 'OUT2').family!, order: 8 } };
    expect(refusal(order8, sixRingChip).details).toMatchObject({
      code: 'SPECIFICATION_UNREACHABLE',
      limit: 'RINGS',
      pointer: '/specification/family/order',
    });
  });

  it('a rejection below the light that no setting removes', () => {
    const dim: ChipModel = { ...sixRingChip, rejectionFloorDb: 35 };
    expect(refusal(everyday.elliptic(100, 'OUT2'), dim).details).toMatchObject({
      limit: 'REJECTION_FLOOR',
      given: 40,
    });
  });

  it('a setting that a channel limit forbids, naming the channel', () => {
    const weak: ChipModel = {
      ...sixRingChip,
      channels: sixRingChip.channels.map((channel) => ({ ...channel, currentLimitMa: 1 })),
    };
    expect(() => ask(everyday.elliptic(100, 'OUT2'), weak)).toThrow(Refusal);
    try {
      ask(everyday.elliptic(100, 'OUT2'), weak);
    } catch (error) {
      const { details } = error as Refusal;
      expect(details).toMatchObject({ code: 'SETTING_UNREACHABLE', limit: 'CHANNEL_CURRENT' });
      expect(weak.channels.some((one) => details.detail.includes(one.channel))).toBe(true);
      expect(details.detail).toMatch(/A whole turn of its phase takes [\d.]+ mW/);
    }
  });
});
