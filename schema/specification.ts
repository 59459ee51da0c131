/** What a filter specification must be to make sense, before any chip is looked at. */
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
const orderRule = z.int().min(1).max(LIMITS.order);

type Issues = z.core.$ZodRawIssue[];

function contradict(issues: Issues, member: string, input: unknown, message: string, fix?: object): void {
  const params = { code: 'SPECIFICATION_INVALID', ...(fix === undefined ? {} : { fix }) };
  issues.push({ code: 'custom', path: [member], input, message, params });
}

const familyShape = z.strictObject({
  family: z.enum(FAMILIES),
  shape: z.enum(SHAPES),
  order: orderRule.optional(),
  centre: frequencyRule.optional(),
  band: intervalRule.optional(),
  stopband: intervalRule.optional(),
  rippleDb: z.number().positive().max(GREATEST_RIPPLE_DB).optional(),
  rejectionDb: z.number().positive().max(DEEPEST_DB).optional(),
  gridGhz: z.number().positive().max(100_000).optional(),
  output: outputRule.optional(),
});

export type FamilySpecificationInput = z.infer<typeof familyShape>;

const leaveOut = (member: string) => ({ reason: `without ${member}`, works: null });

function checkMembers(spec: FamilySpecificationInput, issues: Issues): void {
  const isInterleaver = spec.shape === 'INTERLEAVER';
  if (isInterleaver && spec.band !== undefined) {
    const message = 'does not belong to an INTERLEAVER, which passes half of the free spectral range';
    contradict(issues, 'band', spec.band, message, leaveOut('band'));
  }
  if (!isInterleaver && spec.band === undefined) {
    contradict(issues, 'band', undefined, `is missing; ${spec.shape} needs the interval between its edges`);
  }
  if (!isInterleaver && spec.gridGhz !== undefined) {
    contradict(issues, 'gridGhz', spec.gridGhz, 'belongs to an INTERLEAVER only', leaveOut('gridGhz'));
  }
  if (isInterleaver && (spec.family === 'CHEBYSHEV_I' || spec.family === 'CHEBYSHEV_II')) {
    const message = 'makes no INTERLEAVER: only BUTTERWORTH and ELLIPTIC half-bands are power symmetric';
    contradict(issues, 'family', spec.family, message);
  }
}

function checkLevels(spec: FamilySpecificationInput, issues: Issues): void {
  const { family, shape, rippleDb, rejectionDb } = spec;
  const needsRipple = family === 'CHEBYSHEV_I' || (family === 'ELLIPTIC' && shape !== 'INTERLEAVER');
  const needsRejection = family === 'CHEBYSHEV_II' || family === 'ELLIPTIC';
  if (needsRipple && rippleDb === undefined) {
    contradict(issues, 'rippleDb', undefined, `is missing; ${family} needs its passband ripple`);
  }
  if (family === 'BUTTERWORTH' && rippleDb !== undefined) {
    const message = 'does not belong to BUTTERWORTH, whose edges are its −3.0103 dB points';
    contradict(issues, 'rippleDb', rippleDb, message, leaveOut('rippleDb'));
  }
  if (needsRejection && rejectionDb === undefined) {
    contradict(issues, 'rejectionDb', undefined, `is missing; ${family} needs its rejection`);
  }
  if (rippleDb !== undefined && rejectionDb !== undefined && rejectionDb <= rippleDb) {
    contradict(issues, 'rejectionDb', rejectionDb, `must be more than the ripple of ${rippleDb} dB`);
  }
}

/** The order is given, or what determines it is. */
function checkOrder(spec: FamilySpecificationInput, issues: Issues): void {
  const { order, shape, stopband, rejectionDb } = spec;
  if (stopband !== undefined && rejectionDb === undefined) {
    contradict(issues, 'rejectionDb', undefined, 'is missing; a stopband needs the rejection it asks for');
  }
  if (order !== undefined || (shape === 'INTERLEAVER' && rejectionDb !== undefined)) return;
  if (stopband === undefined || rejectionDb === undefined) {
    contradict(
      issues,
      'order',
      undefined,
      'is missing; give it, or stopband and rejectionDb to find the least',
    );
  }
}

export const familySpecificationRule = familyShape.check(({ value, issues }) => {
  checkMembers(value, issues);
  checkLevels(value, issues);
  checkOrder(value, issues);
});

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

const bandShape = z.strictObject({
  interval: intervalRule,
  minTransmissionDb: transmissionRule.optional(),
  maxTransmissionDb: transmissionRule.optional(),
  output: outputRule.optional(),
  label: textRule(LIMITS.labelCharacters).optional(),
});

export type BandInput = z.infer<typeof bandShape>;

export const bandRule = bandShape.check(({ value, issues }) => {
  const { minTransmissionDb: least, maxTransmissionDb: most } = value;
  if (least === undefined && most === undefined) {
    contradict(
      issues,
      'minTransmissionDb',
      undefined,
      'or maxTransmissionDb is missing; a band asks for one at least',
    );
  }
  if (least !== undefined && most !== undefined && least > most) {
    contradict(issues, 'minTransmissionDb', least, `must not be above maxTransmissionDb ${most}`);
  }
});

export const maskSpecificationRule = z
  .strictObject({
    bands: z.array(bandRule).min(1).max(LIMITS.bands),
    family: z.enum(FAMILIES).optional(),
    order: orderRule.optional(),
    reference: z.enum(REFERENCES).optional(),
  })
  .check(({ value, issues }) => {
    if (value.bands.some((band) => band.minTransmissionDb !== undefined)) return;
    contradict(issues, 'bands', value.bands, 'let nothing pass; at least one band needs minTransmissionDb');
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
