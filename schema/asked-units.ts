/**
 * The core speaks of the canonical request: offsets in GHz, sorted bands. The asker wrote something else. This turns
 * pointers, values and whole suggestions back into the asker's own body and units.
 */
import { sortedBands } from './canonical.ts';
import type { RequestDesignInput } from './design-request.ts';
import { type FrequencyFrame, inUnit } from './offsets.ts';
import { partsOf, pointerOf, valueAt, withEdits } from './pointer.ts';
import type { NearestChange, Problem } from './problem.ts';
import { type FrequencyUnit, type IntervalInput, UNIT_RANGES, unitOf } from './units.ts';

interface Translated {
  readonly path: readonly string[];
  /** Unit of the frequencies at the path; null where there are none. */
  readonly unit: FrequencyUnit | null;
  readonly turn: (value: unknown) => unknown;
}

const asIs = (value: unknown): unknown => value;

function isRecord(value: unknown): value is Record<string, unknown> {
  return typeof value === 'object' && value !== null && !Array.isArray(value);
}

/** Digits beyond a millionth of a hertz are rounding of the way there and back. */
const DIGITS = 15;

function numberIn(unit: FrequencyUnit, frame: FrequencyFrame): (value: unknown) => unknown {
  return (value) =>
    typeof value === 'number' ? Number(inUnit(value, unit, frame).toPrecision(DIGITS)) : value;
}

function rangeIn(unit: FrequencyUnit, frame: FrequencyFrame): (value: unknown) => unknown {
  const turn = numberIn(unit, frame);
  return (value) => {
    if (!isRecord(value) || !('lowGhz' in value)) return value;
    const ends = [turn(value.lowGhz), turn(value.highGhz)];
    if (unit === 'wavelengthNm') ends.reverse();
    return { [unit]: { low: ends[0], high: ends[1] } };
  };
}

function unitIn(interval: unknown): FrequencyUnit {
  return isRecord(interval) ? unitOf(interval as IntervalInput)[0] : 'offsetGhz';
}

function endName(name: string, unit: FrequencyUnit): 'low' | 'high' {
  return (name === 'lowGhz') === (unit !== 'wavelengthNm') ? 'low' : 'high';
}

/** An interval's end, or the whole of it, at `path` of the body. */
function interval(
  path: readonly string[],
  rest: readonly string[],
  at: unknown,
  frame: FrequencyFrame,
): Translated {
  const unit = unitIn(at);
  if (rest[0] === 'lowGhz' || rest[0] === 'highGhz') {
    return { path: [...path, unit, endName(rest[0], unit)], unit, turn: numberIn(unit, frame) };
  }
  return { path, unit, turn: rangeIn(unit, frame) };
}

function bandValue(unit: FrequencyUnit, frame: FrequencyFrame): (value: unknown) => unknown {
  const turn = rangeIn(unit, frame);
  return (value) => {
    if (!isRecord(value) || !('lowGhz' in value)) return value;
    const { lowGhz, highGhz, ...rest } = value;
    return { interval: turn({ lowGhz, highGhz }), ...rest };
  };
}

function maskPath(parts: readonly string[], body: RequestDesignInput, frame: FrequencyFrame): Translated {
  const path = ['specification', ...parts];
  const [, list, index, ...rest] = parts;
  if (list !== 'bands' || index === undefined || body.specification.mask === undefined) {
    return { path, unit: null, turn: asIs };
  }
  const asked = askedBandIndex(Number(index), body, frame);
  const at = body.specification.mask.bands[asked]?.interval;
  const base = ['specification', 'mask', 'bands', String(asked)];
  if (rest.length === 0) {
    const unit = unitIn(at);
    return { path: base, unit, turn: bandValue(unit, frame) };
  }
  if (rest[0] === 'interval') return interval([...base, 'interval'], rest.slice(1), at, frame);
  if (rest[0]!.endsWith('Ghz')) return interval([...base, 'interval'], rest, at, frame);
  return { path: [...base, ...rest], unit: null, turn: asIs };
}

function familyPath(parts: readonly string[], body: RequestDesignInput, frame: FrequencyFrame): Translated {
  const [, member, ...rest] = parts;
  const spec = body.specification.family;
  if ((member === 'band' || member === 'stopband') && spec !== undefined) {
    return interval(['specification', 'family', member], rest, spec[member] ?? spec.band, frame);
  }
  if (member === 'centreGhz') {
    const unit = spec?.centre === undefined ? 'offsetGhz' : unitOf<number>(spec.centre)[0];
    return { path: ['specification', 'family', 'centre', unit], unit, turn: numberIn(unit, frame) };
  }
  return { path: ['specification', ...parts], unit: null, turn: asIs };
}

function translate(pointer: string, body: RequestDesignInput, frame: FrequencyFrame): Translated {
  const parts = partsOf(pointer);
  if (parts[0] !== 'specification') return { path: parts, unit: null, turn: asIs };
  const inside = parts.slice(1);
  if (inside[0] === 'mask') return maskPath(inside, body, frame);
  return inside[0] === 'family' ? familyPath(inside, body, frame) : { path: parts, unit: null, turn: asIs };
}

/** `{min, max, unit: 'GHz'}` about a frequency, in the asker's unit. */
function allowedIn(allowed: unknown, { unit, turn }: Translated, frame: FrequencyFrame): unknown {
  if (unit === null || !isRecord(allowed)) return turn(allowed);
  if (!('min' in allowed || 'max' in allowed)) return turn(allowed);
  const one = numberIn(unit, frame);
  const ends = unit === 'wavelengthNm' ? [allowed.max, allowed.min] : [allowed.min, allowed.max];
  return {
    ...(ends[0] === undefined ? {} : { min: one(ends[0]) }),
    ...(ends[1] === undefined ? {} : { max: one(ends[1]) }),
    unit: UNIT_RANGES[unit].unit,
  };
}

function changeFor(change: NearestChange, body: RequestDesignInput, frame: FrequencyFrame): NearestChange {
  const target = translate(change.pointer, body, frame);
  const unit = target.unit === null ? change.unit : UNIT_RANGES[target.unit].unit;
  return {
    pointer: pointerOf(target.path),
    given: valueAt(body, target.path) ?? null,
    works: change.works === null || change.works === undefined ? null : target.turn(change.works),
    ...(unit === undefined ? {} : { unit }),
  };
}

function askedBandIndex(index: number, body: RequestDesignInput, frame: FrequencyFrame): number {
  const { mask } = body.specification;
  return mask === undefined ? index : (sortedBands(mask.bands, frame)[index]?.askedIndex ?? index);
}

/** The core counts bands in canonical order; what stands in quotes is a label and stays. */
function inAskedBands(detail: string, body: RequestDesignInput, frame: FrequencyFrame): string {
  return detail.replace(/"[^"]*"|\bband (\d+)/g, (all, index: string | undefined) =>
    index === undefined ? all : `band ${askedBandIndex(Number(index), body, frame)}`,
  );
}

/** `{bands: [i, j], commonOffsetGhz}`: two bands that meet, by their positions in the request. */
function collisionIn(given: unknown, body: RequestDesignInput, frame: FrequencyFrame): unknown {
  if (!isRecord(given) || !Array.isArray(given.bands)) return undefined;
  return { ...given, bands: given.bands.map((index) => askedBandIndex(Number(index), body, frame)) };
}

/**
 * A problem of the core for whoever sent `body`. Suggestions become whole bodies; those that `accepts` refuses are
 * dropped. A problem that has no canonical pointers passes unchanged.
 * @param body what `requestDesignRule` accepted of `asked`
 * @param asked the request as it was sent: what suggestions are made of
 */
export function problemInAskedUnits(
  problem: Problem,
  body: RequestDesignInput,
  asked: unknown,
  frame: FrequencyFrame,
  accepts: (input: unknown) => boolean,
): Problem {
  const { pointer, given: canonicalGiven, allowed, nearest, detail, ...others } = problem;
  const rest = { ...others, detail: inAskedBands(detail, body, frame) };
  const offers = nearest.map(({ reason, changes }) => {
    const translated = changes.map((change) => changeFor(change, body, frame));
    return { reason, changes: translated, input: withEdits(asked, translated) };
  });
  const kept = offers.filter((offer) => accepts(offer.input));
  if (pointer === undefined) {
    // About the chip, not about the question: nothing to translate.
    const about = canonicalGiven === undefined ? {} : { given: canonicalGiven };
    return { ...rest, ...about, ...(allowed === undefined ? {} : { allowed }), nearest: kept };
  }
  const target = translate(pointer, body, frame);
  const given = collisionIn(canonicalGiven, body, frame) ?? valueAt(body, target.path);
  return {
    ...rest,
    pointer: pointerOf(target.path),
    ...(given === undefined ? {} : { given }),
    ...(allowed === undefined ? {} : { allowed: allowedIn(allowed, target, frame) }),
    nearest: kept,
  };
}
