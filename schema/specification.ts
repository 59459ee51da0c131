/** Shapes, types and ranges of a filter specification. What physics and filter theory refuse, the core refuses. */
import { z } from 'zod';
import { LIMITS } from './limits.ts';
import { type OneOf, oneOfRule } from './one-of.ts';
import { textRule } from './text.ts';
import { frequencyRule, intervalRule } from './units.ts';

export const FAMILIES = ['BUTTERWORTH', 'CHEBYSHEV_I', 'CHEBYSHEV_II', 'ELLIPTIC'] as const;
export const SHAPES = ['LOW_PASS', 'HIGH_PASS', 'BAND_PASS', 'BAND_STOP', 'INTERLEAVER'] as const;
export const ARCHITECTURES = ['ALL_PASS_PAIR', 'SECTION_CASCADE'] as const;
export const OUTPUTS = ['OUT1', 'OUT2'] as const;
export const REFERENCES = ['INPUT', 'PEAK'] as const;

/** No measurement tells less than this from nothing. */
const DEEPEST_DB = 200;
const GREATEST_RIPPLE_DB = 40;

export const outputRule = z.enum(OUTPUTS);

const orderRule = z
  .int()
  .check(({ value, issues }) => {
    if (value >= 1 && value <= LIMITS.order) return;
    const works = Math.min(LIMITS.order, Math.max(1, value));
    issues.push({
      code: 'custom',
      input: value,
      message: `must be a whole number from 1 to ${LIMITS.order}`,
      params: {
        code: 'SPECIFICATION_INVALID',
        limit: 'ORDER',
        allowed: { min: 1, max: LIMITS.order },
        fix: { reason: `order ${works}`, works },
      },
    });
  })
  .meta({ minimum: 1, maximum: LIMITS.order });

/** A ripple or rejection: dB above 0. One written as a transmission, −1 for 1, is offered with its sign turned. */
const positiveDbRule = (mostDb: number) =>
  z
    .number()
    .check(({ value, issues }) => {
      if (value > 0 && value <= mostDb) return;
      const works = value === 0 ? undefined : Math.min(mostDb, Math.abs(value));
      const reason = value < 0 ? 'the positive value' : `at most ${mostDb} dB`;
      issues.push({
        code: 'custom',
        input: value,
        message: value > 0 ? `must be at most ${mostDb} dB` : 'must be more than 0 dB',
        params: {
          code: 'SPECIFICATION_INVALID',
          allowed: { above: 0, max: mostDb, unit: 'dB' },
          ...(works === undefined ? {} : { fix: { reason, works, unit: 'dB' } }),
        },
      });
    })
    .meta({ exclusiveMinimum: 0, maximum: mostDb });

/** Which members a family and a shape take is decided by the core, which knows what they mean. */
export const familySpecificationRule = z.strictObject({
  family: z.enum(FAMILIES),
  shape: z.enum(SHAPES),
  order: orderRule.optional(),
  centre: frequencyRule.optional(),
  band: intervalRule.optional(),
  stopband: intervalRule.optional(),
  rippleDb: positiveDbRule(GREATEST_RIPPLE_DB).optional(),
  rejectionDb: positiveDbRule(DEEPEST_DB).optional(),
  gridGhz: z.number().positive().max(100_000).optional(),
  output: outputRule.optional(),
});

export type FamilySpecificationInput = z.infer<typeof familySpecificationRule>;

/** dB of transmission are never positive on a passive chip; a rejection written as 40 means −40. */
const transmissionRule = z.number().check(({ value, issues }) => {
  if (value <= 0 && value >= -DEEPEST_DB) return;
  const isSign = value > 0 && value <= DEEPEST_DB;
  const fix = { reason: 'the negative value', works: -value, unit: 'dB' };
  issues.push({
    code: 'custom',
    input: value,
    message: isSign
      ? 'is positive; a transmission of a passive chip lies at or below 0 dB'
      : `must lie between −${DEEPEST_DB} and 0 dB`,
    params: {
      code: 'SPECIFICATION_INVALID',
      allowed: { min: -DEEPEST_DB, max: 0, unit: 'dB' },
      ...(isSign ? { fix } : {}),
    },
  });
});

export const bandRule = z
  .strictObject({
    interval: intervalRule,
    minTransmissionDb: transmissionRule.optional(),
    maxTransmissionDb: transmissionRule.optional(),
    output: outputRule.optional(),
    label: textRule(LIMITS.labelCharacters).optional(),
  })
  .check(({ value, issues }) => {
    if (value.minTransmissionDb !== undefined || value.maxTransmissionDb !== undefined) return;
    const message = 'asks for nothing; minTransmissionDb or maxTransmissionDb is needed';
    issues.push({ code: 'custom', input: value, message, params: { code: 'SPECIFICATION_INVALID' } });
  });

export type BandInput = z.infer<typeof bandRule>;

export const maskSpecificationRule = z.strictObject({
  bands: z.array(bandRule).min(1).max(LIMITS.bands),
  family: z.enum(FAMILIES).optional(),
  order: orderRule.optional(),
  reference: z.enum(REFERENCES).optional(),
});

export type MaskSpecificationInput = z.infer<typeof maskSpecificationRule>;

export const filterSpecificationRule = oneOfRule({
  family: familySpecificationRule,
  mask: maskSpecificationRule,
});

export type FilterSpecificationInput = OneOf<{
  family: FamilySpecificationInput;
  mask: MaskSpecificationInput;
}>;

export const synthesisRule = z.strictObject({ architecture: z.enum(ARCHITECTURES).optional() });
