import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { problemInAskedUnits } from '../../schema/asked-units.ts';
import { canonicalSpecification } from '../../schema/canonical.ts';
import { chipModelOf } from '../../schema/chip.ts';
import { type RequestDesignInput, requestDesignRule } from '../../schema/design-request.ts';
import { inUnit } from '../../schema/offsets.ts';
import { partsOf, valueAt } from '../../schema/pointer.ts';
import { FREQUENCY_UNITS, type FrequencyUnit, type IntervalInput } from '../../schema/units.ts';
import { problemOfRefusal } from '../../server/errors.ts';
import { checkQuestion } from '../../src/design/index.ts';
import { Refusal } from '../../src/errors.ts';
import { smallModel } from './invented-models.ts';

const CHIP = chipModelOf(smallModel());

function check(body: unknown): Refusal | null {
  const read = requestDesignRule.parse(body);
  try {
    checkQuestion({ specification: canonicalSpecification(read.specification, CHIP), synthesis: {} }, CHIP);
    return null;
  } catch (error) {
    if (error instanceof Refusal) return error;
    throw error;
  }
}

function between(lowGhz: number, highGhz: number, unit: FrequencyUnit): IntervalInput {
  const ends = [inUnit(lowGhz, unit, CHIP), inUnit(highGhz, unit, CHIP)];
  if (unit === 'wavelengthNm') ends.reverse();
  return { [unit]: { low: ends[0], high: ends[1] } } as unknown as IntervalInput;
}

function problemFor(body: RequestDesignInput, refusal: Refusal) {
  return problemInAskedUnits(
    problemOfRefusal(refusal.details),
    body,
    body,
    CHIP,
    (input) => requestDesignRule.safeParse(input).success && check(input) === null,
  );
}

const unit = fc.constantFrom(...FREQUENCY_UNITS);

/** Requests of which most are refused: few rings, small bands, deep rejections. */
const request = fc
  .record({
    unit,
    stopUnit: unit,
    family: fc.constantFrom('BUTTERWORTH' as const, 'CHEBYSHEV_I' as const, 'ELLIPTIC' as const),
    centre: fc.integer({ min: -20, max: 20 }),
    half: fc.integer({ min: 1, max: 30 }),
    gap: fc.integer({ min: 0, max: 8 }),
    rejectionDb: fc.integer({ min: 5, max: 90 }),
    order: fc.option(fc.integer({ min: 1, max: 9 }), { nil: undefined }),
  })
  .map((r): RequestDesignInput => {
    const stopLow = r.centre + r.half + r.gap;
    return {
      chip: 'X1',
      specification: {
        family: {
          family: r.family,
          shape: 'BAND_PASS',
          band: between(r.centre - r.half, r.centre + r.half, r.unit),
          stopband: between(stopLow, Math.max(stopLow, r.centre + 50 - r.half - r.gap), r.stopUnit),
          rejectionDb: r.rejectionDb,
          ...(r.family === 'BUTTERWORTH' ? {} : { rippleDb: 1 }),
          ...(r.order === undefined ? {} : { order: r.order }),
        },
      },
    };
  });

describe('a refusal in the units of the asker', () => {
  it('[property] points at what was sent, and every request it offers is accepted', () => {
    let offered = 0;
    fc.assert(
      fc.property(request, (body) => {
        const refusal = check(body);
        if (refusal === null) return;
        const problem = problemFor(body, refusal);
        for (const { input, changes } of problem.nearest) {
          offered += 1;
          expect(check(input)).toBeNull();
          for (const { pointer, works } of changes) {
            if (works !== null) expect(valueAt(input, partsOf(pointer))).toEqual(works);
          }
        }
        if (refusal.details.given !== undefined && refusal.details.given !== null) {
          expect(valueAt(body, partsOf(problem.pointer ?? ''))).toBeDefined();
        }
      }),
      { numRuns: 300, seed: 20_261 },
    );
    expect(offered).toBeGreaterThan(50);
  });

  it('[property] keeps the unit of the band that it changes', () => {
    const body: RequestDesignInput = {
      chip: 'X1',
      specification: {
        family: {
          family: 'ELLIPTIC',
          shape: 'BAND_PASS',
          order: 2,
          band: between(-5, 5, 'wavelengthNm'),
          stopband: between(6, 44, 'wavelengthNm'),
          rippleDb: 1,
          rejectionDb: 60,
        },
      },
    };
    const refusal = check(body);
    expect(refusal).not.toBeNull();
    const changes = problemFor(body, refusal!).nearest.flatMap((offer) => offer.changes);
    const edges = changes.find((change) => change.pointer === '/specification/family/stopband');
    expect(edges).toMatchObject({ unit: 'nm', works: { wavelengthNm: { low: expect.any(Number) } } });
  });

  it('[property] names colliding bands by their places in the request', () => {
    const body: RequestDesignInput = {
      chip: 'X1',
      specification: {
        mask: {
          bands: [
            {
              interval: { frequencyThz: { low: 193.15, high: 193.15 } },
              maxTransmissionDb: -30,
              label: 'pump',
            },
            { interval: { frequencyThz: { low: 193.1, high: 193.1 } }, minTransmissionDb: -1 },
          ],
        },
      },
    };
    // 193.15 THz lies one free spectral range of 50 GHz above 193.10 THz.
    const refusal = check(body);
    expect(refusal?.details.code).toBe('BANDS_COLLIDE');
    const problem = problemFor(body, refusal!);
    expect(problem.pointer).toBe('/specification/mask/bands/0');
    expect(problem.given).toMatchObject({ bands: [1, 0] });
    expect(problem.detail).toContain('"pump" (band 0)');
    expect(problem.detail).toContain('band 1');
  });
});
