import { createHash } from 'node:crypto';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { askedOfSpecification, canonicalSpecification, designText } from '../../schema/canonical.ts';
import { inUnit, offsetGhzOf } from '../../schema/offsets.ts';
import { type FilterSpecificationInput, filterSpecificationRule } from '../../schema/specification.ts';
import { FREQUENCY_UNITS, type IntervalInput } from '../../schema/units.ts';

/** Invented chips. */
const CHIP = { referenceFrequencyThz: 193.1, fsrGhz: 50 };
const OTHER_CHIP = { referenceFrequencyThz: 193.4125, fsrGhz: 100 };

/** Speed of light, nm·THz (SI Brochure, 9th edition, 2019: 299 792 458 m/s exactly). */
const C = 299_792.458;

const sha256 = (text: string): string => createHash('sha256').update(text, 'utf8').digest('hex');

/**
 * Text and hash of the contract between the service and its clients, made by a script that shares no code with the
 * service. The revision hash is the SHA-256 of nothing.
 */
const VECTOR_TEXT =
  '{"chipRevision":"e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855","engine":"1","kind":"design","schema":1,"specification":{"family":{"band":{"highGhz":12.5,"lowGhz":-12.5},"centreGhz":0,"family":"ELLIPTIC","order":4,"output":"OUT1","rejectionDb":40,"rippleDb":2,"shape":"LOW_PASS"}},"synthesis":{}}';
const VECTOR_HASH = '127da94dca021831f66832eda06ab52ce922338008c386a60f8950f5d31f3b0c';

const elliptic = (band: IntervalInput): FilterSpecificationInput => ({
  family: { family: 'ELLIPTIC', shape: 'LOW_PASS', order: 4, rippleDb: 2, rejectionDb: 40, band },
});

function textOf(specification: FilterSpecificationInput, frame = CHIP): string {
  return designText({
    engine: '1',
    chipRevisionHash: sha256(''),
    specification: canonicalSpecification(specification, frame),
    synthesis: {},
  });
}

const bandOf = (specification: FilterSpecificationInput, frame = CHIP) =>
  canonicalSpecification(specification, frame).family;

describe('canonical text of a question', () => {
  it.each([
    ['offsets in GHz', { offsetGhz: { low: -12.5, high: 12.5 } }],
    ['offsets in FSR', { offsetFsr: { low: -0.25, high: 0.25 } }],
    ['THz', { frequencyThz: { low: 193.0875, high: 193.1125 } }],
    ['nm written in full', { wavelengthNm: { low: C / 193.1125, high: C / 193.0875 } }],
  ] as [string, IntervalInput][])('[cross-check] of the same band in %s is the same', (_, band) => {
    expect(textOf(elliptic(band))).toBe(VECTOR_TEXT);
    expect(sha256(textOf(elliptic(band)))).toBe(VECTOR_HASH);
  });

  it('[cross-check] of a rounded wavelength is another one: it is another frequency', () => {
    const rounded = elliptic({ wavelengthNm: { low: 1552.4239, high: 1552.6249 } });
    expect(sha256(textOf(rounded))).not.toBe(VECTOR_HASH);
  });

  it('[property] does not depend on the unit for lines on a 1 MHz raster', () => {
    fc.assert(
      fc.property(fc.integer({ min: -200_000, max: 200_000 }), (mhz) => {
        const thz = Number((193.1 + mhz * 1e-6).toFixed(6));
        const offset = offsetGhzOf(thz, 'frequencyThz', CHIP);
        expect(offset).toBe(mhz / 1e3);
        expect(offsetGhzOf(C / thz, 'wavelengthNm', CHIP)).toBe(offset);
      }),
      { numRuns: 2_000 },
    );
  });

  it('[property] does not depend on the order in which bands are sent', () => {
    const band = fc.record({
      interval: fc
        .tuple(fc.integer({ min: -20, max: 20 }), fc.integer({ min: 0, max: 5 }))
        .map(([low, width]) => ({ offsetGhz: { low, high: low + width } })),
      minTransmissionDb: fc.constantFrom(-1, -3),
      output: fc.constantFrom('OUT1' as const, 'OUT2' as const),
      label: fc.constantFrom('a', 'b'),
    });
    fc.assert(
      fc.property(fc.array(band, { minLength: 2, maxLength: 6 }), (bands) => {
        expect(textOf({ mask: { bands: bands.toReversed() } })).toBe(textOf({ mask: { bands } }));
      }),
    );
  });

  it('[property] of a specification told back in offsets is the same text', () => {
    const bands = [
      { interval: { frequencyThz: { low: 193.11, high: 193.12 } }, maxTransmissionDb: -30, label: 'pump' },
      { interval: { offsetFsr: { low: -0.1, high: 0.1 } }, minTransmissionDb: -1 },
    ];
    for (const asked of [
      elliptic({ wavelengthNm: { low: 1552.4, high: 1552.6 } }),
      { mask: { bands, family: 'ELLIPTIC' } },
    ] as FilterSpecificationInput[]) {
      const canonical = canonicalSpecification(asked, CHIP);
      const again = askedOfSpecification(canonical);
      expect(filterSpecificationRule.parse(again)).toEqual(again);
      expect(canonicalSpecification(again, CHIP)).toEqual(canonical);
    }
  });
});

describe('defaults of a specification', () => {
  it('[property] turn an interval in nm round', () => {
    const family = bandOf(elliptic({ wavelengthNm: { low: 1552.4, high: 1552.6 } }));
    expect(family?.band?.lowGhz).toBeLessThan(family?.band?.highGhz ?? 0);
  });

  it('[property] put a BAND_PASS into the middle of its band and a LOW_PASS on the reference', () => {
    const band = { offsetGhz: { low: 5, high: 9 } };
    const shaped = (shape: 'BAND_PASS' | 'LOW_PASS') =>
      bandOf({ family: { family: 'BUTTERWORTH', shape, order: 3, band } });
    expect(shaped('BAND_PASS')?.centreGhz).toBe(7);
    expect(shaped('LOW_PASS')?.centreGhz).toBe(0);
  });

  it('[published] put an INTERLEAVER on the line of ITU-T G.694.1 nearest to the reference', () => {
    // Lines of the 50 GHz grid are 193.1 THz + n · 0.05 THz (ITU-T G.694.1, clause 6): 193.40 is nearest to 193.4125.
    const family = bandOf(
      { family: { family: 'BUTTERWORTH', shape: 'INTERLEAVER', order: 3, gridGhz: 50 } },
      OTHER_CHIP,
    );
    expect(inUnit(family?.centreGhz ?? 0, 'frequencyThz', OTHER_CHIP)).toBe(193.4);
    expect(family?.centreGhz).toBe(-12.5);
  });

  it('[property] name OUT1 and INPUT', () => {
    const { mask } = canonicalSpecification(
      { mask: { bands: [{ interval: { offsetGhz: { low: 0, high: 0 } }, minTransmissionDb: -1 }] } },
      CHIP,
    );
    expect(mask?.reference).toBe('INPUT');
    expect(mask?.bands[0]?.output).toBe('OUT1');
  });
});

describe('units', () => {
  it('[property] come back to the hertz from every unit', () => {
    /** Half a hertz in GHz, and the rounding of an offset of some 10 THz. */
    const HALF_HERTZ_GHZ = 0.6e-9;
    fc.assert(
      fc.property(
        fc.double({ min: -10_000, max: 10_000, noNaN: true }),
        fc.constantFrom(...FREQUENCY_UNITS),
        (offset, unit) => {
          const back = offsetGhzOf(inUnit(offset, unit, CHIP), unit, CHIP);
          expect(Math.abs(back - offset)).toBeLessThan(HALF_HERTZ_GHZ + 1e-12 * Math.abs(offset));
        },
      ),
      { numRuns: 1_000 },
    );
  });
});
