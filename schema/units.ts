/**
 * Frequencies, intervals and grids in the asker's unit. The ranges of THz and nm do not overlap, so a number in the
 * wrong member is always noticed, and the way out is known.
 */
import { z } from 'zod';
import { LIMITS } from './limits.ts';
import { type OneOf, oneOfRule } from './one-of.ts';

export const UNIT_RANGES = {
  frequencyThz: { min: 100, max: 500, unit: 'THz' },
  wavelengthNm: { min: 600, max: 3000, unit: 'nm' },
  /** No chip spans more; absolute frequencies written in GHz fall outside. */
  offsetGhz: { min: -50_000, max: 50_000, unit: 'GHz' },
  offsetFsr: { min: -10_000, max: 10_000, unit: 'FSR' },
} as const;

export type FrequencyUnit = keyof typeof UNIT_RANGES;
export const FREQUENCY_UNITS = Object.keys(UNIT_RANGES) as readonly FrequencyUnit[];

/** How an out-of-range number is mended: kept or scaled, in the same member or another. */
interface Mend {
  readonly member: FrequencyUnit;
  readonly scale: number;
  readonly looksLike: string;
  readonly lies: (value: number) => boolean;
}

const isIn = (unit: FrequencyUnit, scale: number) => (value: number) =>
  value * scale >= UNIT_RANGES[unit].min && value * scale <= UNIT_RANGES[unit].max;

const mend = (member: FrequencyUnit, scale: number, looksLike: string): Mend => ({
  member,
  scale,
  looksLike,
  lies: isIn(member, scale),
});

const MENDS: Readonly<Record<FrequencyUnit, readonly Mend[]>> = {
  frequencyThz: [
    mend('wavelengthNm', 1, 'a wavelength in nm'),
    mend('frequencyThz', 1e-3, 'a frequency in GHz'),
    mend('frequencyThz', 1e-12, 'a frequency in Hz'),
  ],
  wavelengthNm: [
    mend('frequencyThz', 1, 'a frequency in THz'),
    mend('wavelengthNm', 1e3, 'a wavelength in µm'),
    mend('wavelengthNm', 1e9, 'a wavelength in m'),
  ],
  offsetGhz: [mend('frequencyThz', 1e-3, 'an absolute frequency in GHz')],
  offsetFsr: [],
};

type Issues = z.core.$ZodRawIssue[];
type Numbers = Readonly<Record<string, number>>;

/** Scaled without the digits that binary fractions add: 1.55 µm are 1550 nm, not 1550.0000000000002. */
const scaled = (value: number, scale: number): number => Number((value * scale).toPrecision(15));

/** Pushes one issue for the whole value if all its numbers lie where another unit would, else one for each outside. */
function checkUnit(
  unit: FrequencyUnit,
  numbers: Numbers,
  rest: object,
  input: unknown,
  issues: Issues,
): void {
  const { min, max, unit: symbol } = UNIT_RANGES[unit];
  const values = Object.values(numbers);
  const outside = Object.entries(numbers).filter(([, value]) => value < min || value > max);
  if (outside.length === 0) return;
  const way = MENDS[unit].find((one) => values.every(one.lies));
  if (way !== undefined) {
    const mended = Object.entries(numbers).map(([name, value]) => [name, scaled(value, way.scale)] as const);
    const works = typeof input === 'number' ? mended[0]![1] : { ...rest, ...Object.fromEntries(mended) };
    const reason = `the same numbers as ${way.looksLike}`;
    const fix = { reason, member: way.member, works, unit: UNIT_RANGES[way.member].unit };
    const message = `looks like ${way.looksLike}, not ${symbol}; ${unit} takes ${min} to ${max} ${symbol}`;
    issues.push({
      code: 'custom',
      input,
      message,
      params: { code: 'WRONG_UNIT', allowed: { min, max, unit: symbol }, fix },
    });
    return;
  }
  for (const [name, value] of outside) {
    issues.push({
      code: 'custom',
      path: typeof input === 'number' ? [] : [name],
      input: value,
      message: `must lie between ${min} and ${max} ${symbol}`,
      params: { code: 'SPECIFICATION_INVALID', allowed: { min, max, unit: symbol } },
    });
  }
}

function checkOrder(
  low: number,
  high: number,
  names: readonly [string, string],
  fixed: unknown,
  issues: Issues,
): void {
  if (low <= high) return;
  const fix = { reason: 'the ends exchanged', works: fixed };
  issues.push({
    code: 'custom',
    input: fixed,
    message: `has its ends crossed: ${names[0]} ${low} is above ${names[1]} ${high}`,
    params: { code: 'SPECIFICATION_INVALID', fix },
  });
}

const pointRule = (unit: FrequencyUnit) =>
  z.number().check((ctx) => checkUnit(unit, { value: ctx.value }, {}, ctx.value, ctx.issues));

const rangeRule = (unit: FrequencyUnit) =>
  z.strictObject({ low: z.number(), high: z.number() }).check(({ value, issues }) => {
    checkUnit(unit, { low: value.low, high: value.high }, {}, value, issues);
    checkOrder(value.low, value.high, ['low', 'high'], { low: value.high, high: value.low }, issues);
  });

const pointsRule = z
  .int()
  .min(2)
  .check(({ value, issues }) => {
    if (value <= LIMITS.gridPoints) return;
    const allowed = { min: 2, max: LIMITS.gridPoints };
    const fix = { reason: 'as many points as a curve may have', works: LIMITS.gridPoints };
    const message = `asks for too many points; a curve has at most ${LIMITS.gridPoints}, and reduceTo thins it out`;
    const params = { code: 'SPECIFICATION_INVALID', allowed, limit: 'GRID_POINTS', fix };
    issues.push({ code: 'custom', input: value, message, params });
  });

const spanRule = (unit: FrequencyUnit) =>
  z.strictObject({ start: z.number(), stop: z.number(), points: pointsRule }).check(({ value, issues }) => {
    const { start, stop, points } = value;
    checkUnit(unit, { start, stop }, { points }, value, issues);
    checkOrder(start, stop, ['start', 'stop'], { start: stop, stop: start, points }, issues);
    if (start !== stop) return;
    const message = 'has no width: start and stop are equal';
    issues.push({ code: 'custom', input: value, message, params: { code: 'SPECIFICATION_INVALID' } });
  });

function perUnit<T extends z.ZodType>(rule: (unit: FrequencyUnit) => T): Record<FrequencyUnit, T> {
  return {
    frequencyThz: rule('frequencyThz'),
    wavelengthNm: rule('wavelengthNm'),
    offsetGhz: rule('offsetGhz'),
    offsetFsr: rule('offsetFsr'),
  };
}

export const frequencyRule = oneOfRule(perUnit(pointRule));
export const intervalRule = oneOfRule(perUnit(rangeRule));
export const gridRule = oneOfRule(perUnit(spanRule));

export interface Range {
  readonly low: number;
  readonly high: number;
}

export interface Span {
  readonly start: number;
  readonly stop: number;
  readonly points: number;
}

export type FrequencyInput = OneOf<Record<FrequencyUnit, number>>;
export type IntervalInput = OneOf<Record<FrequencyUnit, Range>>;
export type GridInput = OneOf<Record<FrequencyUnit, Span>>;

/** The unit that a one-of value uses, and its content. */
export function unitOf<T>(input: OneOf<Record<FrequencyUnit, T>>): readonly [FrequencyUnit, T] {
  const entries = Object.entries(input) as [FrequencyUnit, T | undefined][];
  const used = entries.find(([, value]) => value !== undefined);
  if (used === undefined) throw new TypeError('a one-of value without a member');
  return used as readonly [FrequencyUnit, T];
}
