import { readFileSync } from 'node:fs';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { Refusal, type Suggestion } from '../../../src/errors.ts';
import {
  type Family,
  type FilterSpecification,
  type MaskSpecification,
  transmissionAt,
} from '../../../src/filter/index.ts';
import { type Capacity, type FilterPlan, planFilters } from '../../../src/filter/plan/index.ts';

/** Samples carry 17 digits from 60-digit arithmetic; the stated tolerance of the reference set. */
const SAMPLE_DB = 1e-7;
/** Nulls are points: below this level only "deep" is compared. */
const DEEP_DB = -150;
/** What rounding of edges and levels may cost a demand that is met exactly. */
const ROUNDING_DB = 1e-5;

const WIDE: Capacity = { order: 16, halfBandOrder: 15, limit: 'ORDER' };

interface OpticalDesign {
  readonly id: string;
  readonly spec: {
    readonly family: 'ellip' | 'butter';
    readonly FSR_GHz: number;
    readonly passband_full_width_GHz: number;
    readonly stopband_full_width_GHz: number;
    readonly passband_ripple_dB: number;
    readonly stopband_attenuation_dB: number;
  };
  readonly values: {
    readonly N: number;
    readonly samples: readonly (readonly [number, number | null, number])[];
  };
}

const reference = JSON.parse(
  readFileSync(new URL('../../reference/plan-optical-designs.json', import.meta.url), 'utf8'),
) as { entries: OpticalDesign[] };

const FAMILY: Record<string, Family> = { ellip: 'ELLIPTIC', butter: 'BUTTERWORTH' };

function maskOf({ spec }: OpticalDesign, family?: Family): MaskSpecification {
  const pass = spec.passband_full_width_GHz / 2;
  const stop = spec.stopband_full_width_GHz / 2;
  return {
    reference: 'PEAK',
    bands: [
      { lowGhz: -pass, highGhz: pass, minTransmissionDb: -spec.passband_ripple_dB, output: 'OUT1' },
      {
        lowGhz: stop,
        highGhz: spec.FSR_GHz - stop,
        maxTransmissionDb: -spec.stopband_attenuation_dB,
        output: 'OUT1',
      },
    ],
    ...(family ? { family } : {}),
  };
}

function levelDb(plan: FilterPlan, offsetGhz: number, fsrGhz: number): number {
  return 10 * Math.log10(Math.max(transmissionAt(plan.filter, (2 * Math.PI * offsetGhz) / fsrGhz), 1e-30));
}

function refusalOf(specification: FilterSpecification, fsrGhz: number, capacity = WIDE): Refusal {
  try {
    planFilters(specification, fsrGhz, capacity);
  } catch (error) {
    if (error instanceof Refusal) return error;
    throw error;
  }
  throw new Error('was not refused');
}

describe('masks', () => {
  it.each(reference.entries)(
    '$id: least order and response of the optical requirement [cross-check]',
    (entry) => {
      const [found] = planFilters(
        { mask: maskOf(entry, FAMILY[entry.spec.family]!) },
        entry.spec.FSR_GHz,
        WIDE,
      );
      expect(found!.leastOrder).toBe(entry.values.N);
      // The first plan spends the whole allowance at the pass edge, as the reference design does. An elliptic reference
      // has the demanded rejection and a nearer stopband edge; only its passband is comparable.
      const plan = found!.plans[0]!;
      for (const [offset, db] of entry.values.samples) {
        const inPassband = offset <= entry.spec.passband_full_width_GHz / 2;
        if (
          db === null ||
          db < DEEP_DB ||
          (entry.spec.family === 'ellip' &&
            !(inPassband && offset === entry.spec.passband_full_width_GHz / 2))
        )
          continue;
        expect(levelDb(plan, offset, entry.spec.FSR_GHz)).toBeCloseTo(db, -Math.log10(SAMPLE_DB * 2));
      }
    },
  );

  it('every plan of every family meets the mask that was asked for [property]', () => {
    const asked = fc.record({
      pass: fc.double({ min: 0.02, max: 0.3, noNaN: true }),
      gap: fc.double({ min: 0.03, max: 0.15, noNaN: true }),
      centre: fc.double({ min: -3, max: 3, noNaN: true }),
      rippleDb: fc.double({ min: 0.05, max: 3, noNaN: true }),
      rejectionDb: fc.double({ min: 6, max: 60, noNaN: true }),
    });
    fc.assert(
      fc.property(asked, ({ pass, gap, centre, rippleDb, rejectionDb }) => {
        fc.pre(rejectionDb > 2 * rippleDb);
        const fsrGhz = 100;
        const middle = centre * fsrGhz;
        const at = (distance: number) => middle + distance * fsrGhz;
        const mask: MaskSpecification = {
          reference: 'PEAK',
          bands: [
            { lowGhz: at(-pass), highGhz: at(pass), minTransmissionDb: -rippleDb, output: 'OUT1' },
            {
              lowGhz: at(pass + gap),
              highGhz: at(1 - pass - gap),
              maxTransmissionDb: -rejectionDb,
              output: 'OUT1',
            },
          ],
        };
        for (const { plans } of planFilters({ mask }, fsrGhz, WIDE)) {
          for (const plan of plans) {
            for (const edge of [-pass, 0, pass]) {
              expect(levelDb(plan, at(edge), fsrGhz)).toBeGreaterThan(-rippleDb - ROUNDING_DB);
            }
            for (const edge of [pass + gap, 0.5, 1 - pass - gap]) {
              expect(levelDb(plan, at(edge), fsrGhz)).toBeLessThan(-rejectionDb + ROUNDING_DB);
            }
          }
        }
      }),
      { numRuns: 40 },
    );
  });

  it('a pump between two lines becomes one stopband around the pump, with the passband half an FSR away [property]', () => {
    const line = (at: number, level: object) => ({
      lowGhz: at - 1,
      highGhz: at + 1,
      output: 'OUT1' as const,
      ...level,
    });
    const mask: MaskSpecification = {
      reference: 'INPUT',
      bands: [
        line(-20, { minTransmissionDb: -1 }),
        line(0, { maxTransmissionDb: -60 }),
        line(20, { minTransmissionDb: -1 }),
      ],
    };
    const plans = planFilters({ mask }, 100, WIDE).flatMap((one) => one.plans);
    expect(plans.length).toBeGreaterThan(0);
    for (const plan of plans) {
      expect(Math.abs(Math.abs(plan.centreRad) - Math.PI)).toBeLessThan(1e-12);
      for (const offset of [-1, 0, 1]) expect(levelDb(plan, offset, 100)).toBeLessThan(-60 + ROUNDING_DB);
      for (const offset of [-21, -19, 19, 21])
        expect(levelDb(plan, offset, 100)).toBeGreaterThan(-1 - ROUNDING_DB);
    }
  });

  it('lines one FSR apart with contrary demands are refused with exactly that explanation [property]', () => {
    const mask: MaskSpecification = {
      reference: 'INPUT',
      bands: [
        { lowGhz: 0, highGhz: 0, maxTransmissionDb: -60, output: 'OUT1', label: 'pump' },
        { lowGhz: 100, highGhz: 100, minTransmissionDb: -1, output: 'OUT1', label: 'signal' },
      ],
    };
    const { details } = refusalOf({ mask }, 100);
    expect(details.code).toBe('BANDS_COLLIDE');
    expect(details.detail).toMatch(
      /"signal" .*"pump" .*both fall on 0 GHz.*repeats every free spectral range/,
    );
    expect(planFilters({ mask }, 130, WIDE).some((one) => one.plans.length > 0)).toBe(true);
  });

  it('what must pass one output and is kept from the other only is refused: nothing is to be stopped [regression]', () => {
    for (const low of [-17, 30]) {
      const bands = [
        { lowGhz: -17, highGhz: 17, minTransmissionDb: -1, output: 'OUT1' as const },
        { lowGhz: low, highGhz: low + 34, maxTransmissionDb: -20, output: 'OUT2' as const },
      ];
      const { details } = refusalOf({ mask: { reference: 'INPUT', bands } }, 100);
      expect(details.code).toBe('SPECIFICATION_INVALID');
      expect(details.detail).toContain('no stopband for OUT1');
    }
  });

  it('any mask is planned or refused with its reason, never an error of another kind [property]', () => {
    const level = fc.option(fc.double({ min: -60, max: -0.01, noNaN: true }), { nil: undefined });
    const band = fc.record({
      low: fc.double({ min: -50, max: 50, noNaN: true }),
      width: fc.double({ min: 0, max: 40, noNaN: true }),
      least: level,
      most: level,
      output: fc.constantFrom('OUT1' as const, 'OUT2' as const),
    });
    fc.assert(
      fc.property(fc.array(band, { minLength: 1, maxLength: 4 }), (drawn) => {
        const bands = drawn.map(({ low, width, least, most, output }) => ({
          lowGhz: low,
          highGhz: low + width,
          output,
          ...(least === undefined ? {} : { minTransmissionDb: least }),
          ...(most === undefined ? {} : { maxTransmissionDb: most }),
        }));
        try {
          planFilters({ mask: { reference: 'INPUT', bands } }, 100, WIDE);
        } catch (error) {
          expect(error).toBeInstanceOf(Refusal);
        }
      }),
      { numRuns: 300, seed: 1 },
    );
  });

  it('two outputs that both must pass the same light are refused for passivity [property]', () => {
    const mask: MaskSpecification = {
      reference: 'INPUT',
      bands: [
        { lowGhz: -5, highGhz: 5, minTransmissionDb: -1, output: 'OUT1' },
        { lowGhz: -5, highGhz: 5, minTransmissionDb: -1, output: 'OUT2' },
        { lowGhz: 40, highGhz: 60, maxTransmissionDb: -20, output: 'OUT1' },
      ],
    };
    expect(refusalOf({ mask }, 100).details.limit).toBe('PASSIVITY');
  });

  it('a mask without a passband, and one without a stopband, are invalid', () => {
    const stop = { lowGhz: 30, highGhz: 70, maxTransmissionDb: -20, output: 'OUT1' as const };
    const pass = { lowGhz: -10, highGhz: 10, minTransmissionDb: -1, output: 'OUT1' as const };
    for (const bands of [[stop], [pass]]) {
      expect(refusalOf({ mask: { reference: 'INPUT', bands } }, 100).details.code).toBe(
        'SPECIFICATION_INVALID',
      );
    }
  });
});

function applied(specification: FilterSpecification, suggestion: Suggestion): FilterSpecification {
  const copy = structuredClone({ specification }) as Record<string, unknown>;
  for (const { pointer, works } of suggestion.changes) {
    const path = pointer.slice(1).split('/');
    const member = path.pop()!;
    // biome-ignore lint/suspicious/noExplicitAny: walks a JSON document by its pointer
    const parent = path.reduce((node: any, key) => node[key], copy) as Record<string, unknown>;
    if (member === 'interval') Object.assign(parent, works);
    else if (works === null) delete parent[member];
    else parent[member] = works;
  }
  return copy.specification as FilterSpecification;
}

describe('refusals', () => {
  const hard = fc.record({
    family: fc.constantFrom<Family | 'MASK'>(
      'BUTTERWORTH',
      'CHEBYSHEV_I',
      'CHEBYSHEV_II',
      'ELLIPTIC',
      'MASK',
    ),
    pass: fc.double({ min: 0.05, max: 0.3, noNaN: true }),
    gap: fc.double({ min: 0.005, max: 0.1, noNaN: true }),
    rejectionDb: fc.integer({ min: 20, max: 90 }),
    rings: fc.integer({ min: 1, max: 6 }),
  });

  it('everything that is suggested instead is accepted [property]', () => {
    let suggested = 0;
    fc.assert(
      fc.property(hard, ({ family, pass, gap, rejectionDb, rings }) => {
        const band = { lowGhz: -pass * 100, highGhz: pass * 100 };
        const stopband = { lowGhz: (pass + gap) * 100, highGhz: (1 - pass - gap) * 100 };
        const specification: FilterSpecification =
          family === 'MASK'
            ? {
                mask: {
                  reference: 'PEAK',
                  bands: [
                    { ...band, minTransmissionDb: -0.5, output: 'OUT1' },
                    { ...stopband, maxTransmissionDb: -rejectionDb, output: 'OUT1' },
                  ],
                },
              }
            : {
                family: {
                  family,
                  shape: 'LOW_PASS',
                  centreGhz: 0,
                  band,
                  stopband,
                  rejectionDb,
                  output: 'OUT1',
                  ...(family === 'BUTTERWORTH' ? {} : { rippleDb: 0.5 }),
                },
              };
        const capacity: Capacity = { order: rings, halfBandOrder: rings - (1 - (rings % 2)), limit: 'RINGS' };
        try {
          planFilters(specification, 100, capacity);
        } catch (error) {
          if (!(error instanceof Refusal)) throw error;
          expect(error.details.limit).toBe('RINGS');
          for (const suggestion of error.details.nearest ?? []) {
            suggested++;
            expect(() => planFilters(applied(specification, suggestion), 100, capacity)).not.toThrow();
          }
        }
      }),
      { numRuns: 200 },
    );
    expect(suggested).toBeGreaterThan(20);
  });

  it('an interleaver of another spacing than half the FSR, of even order or of another family is refused with what works', () => {
    const base = {
      shape: 'INTERLEAVER',
      centreGhz: 0,
      band: { lowGhz: -12, highGhz: 12 },
      rejectionDb: 25,
      output: 'OUT1',
    } as const;
    const spacing = refusalOf({ family: { ...base, family: 'ELLIPTIC', gridGhz: 100 } }, 100).details;
    expect(spacing.limit).toBe('FREE_SPECTRAL_RANGE');
    expect(spacing.nearest?.[0]?.changes[0]?.works).toBe(50);
    expect(
      refusalOf({ family: { ...base, family: 'ELLIPTIC', order: 4 } }, 100).details.nearest?.[0]?.changes[0]
        ?.works,
    ).toBe(3);
    expect(refusalOf({ family: { ...base, family: 'CHEBYSHEV_I', rippleDb: 1 } }, 100).details.pointer).toBe(
      '/specification/family/family',
    );
  });

  it('bands wider than the FSR, off centre, and parameters that would be ignored are refused', () => {
    const base = {
      family: 'BUTTERWORTH',
      shape: 'LOW_PASS',
      centreGhz: 0,
      order: 3,
      output: 'OUT1',
    } as const;
    expect(refusalOf({ family: { ...base, band: { lowGhz: -60, highGhz: 60 } } }, 100).details.limit).toBe(
      'FREE_SPECTRAL_RANGE',
    );
    expect(refusalOf({ family: { ...base, band: { lowGhz: -10, highGhz: 20 } } }, 100).details.pointer).toBe(
      '/specification/family/band',
    );
    expect(
      refusalOf({ family: { ...base, band: { lowGhz: -10, highGhz: 10 }, rippleDb: 1 } }, 100).details
        .pointer,
    ).toBe('/specification/family/rippleDb');
  });
});

describe('interleaver', () => {
  it('isolates both outputs in the channel window by at least what was asked [property]', () => {
    const [found] = planFilters(
      {
        family: {
          family: 'ELLIPTIC',
          shape: 'INTERLEAVER',
          centreGhz: 0,
          band: { lowGhz: -12, highGhz: 12 },
          rejectionDb: 25,
          output: 'OUT1',
        },
      },
      100,
      WIDE,
    );
    const plan = found!.plans[0]!;
    expect(plan.order % 2).toBe(1);
    for (const offset of [0, 5, 12]) {
      const own = transmissionAt(plan.filter, (2 * Math.PI * offset) / 100);
      expect(10 * Math.log10(1 - own)).toBeLessThan(-25);
      expect(levelDb(plan, 50 - offset, 100)).toBeLessThan(-25);
    }
  });
});
