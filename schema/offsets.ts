/**
 * Between the units of the wire and offsets in GHz from the chip's reference frequency. Absolute values pass through
 * whole hertz, so that the same line gives the same offset, to the last bit, whichever way it was written.
 */
import { NM_THZ } from '../src/conventions.ts';
import { type FrequencyInput, type FrequencyUnit, type IntervalInput, type Range, unitOf } from './units.ts';

/** What of a chip a unit depends on. */
export interface FrequencyFrame {
  readonly referenceFrequencyThz: number;
  readonly fsrGhz: number;
}

const HZ_PER_THZ = 1e12;
const HZ_PER_GHZ = 1e9;

function referenceHz(frame: FrequencyFrame): number {
  return Math.round(frame.referenceFrequencyThz * HZ_PER_THZ);
}

/** Exact to the hertz: whole hertz below 2^53 are doubles. */
export function offsetGhzOf(value: number, unit: FrequencyUnit, frame: FrequencyFrame): number {
  switch (unit) {
    case 'offsetGhz':
      return 0 + value;
    case 'offsetFsr':
      return 0 + value * frame.fsrGhz;
    case 'frequencyThz':
      return (Math.round(value * HZ_PER_THZ) - referenceHz(frame)) / HZ_PER_GHZ;
    case 'wavelengthNm':
      return (Math.round((NM_THZ / value) * HZ_PER_THZ) - referenceHz(frame)) / HZ_PER_GHZ;
  }
}

/** The other way; wavelengths are vacuum wavelengths. */
export function inUnit(offsetGhz: number, unit: FrequencyUnit, frame: FrequencyFrame): number {
  switch (unit) {
    case 'offsetGhz':
      return 0 + offsetGhz;
    case 'offsetFsr':
      return 0 + offsetGhz / frame.fsrGhz;
    case 'frequencyThz':
      return (referenceHz(frame) + offsetGhz * HZ_PER_GHZ) / HZ_PER_THZ;
    case 'wavelengthNm':
      return NM_THZ / ((referenceHz(frame) + offsetGhz * HZ_PER_GHZ) / HZ_PER_THZ);
  }
}

export function frequencyOffsetGhz(input: FrequencyInput, frame: FrequencyFrame): number {
  const [unit, value] = unitOf<number>(input);
  return offsetGhzOf(value, unit, frame);
}

/** Ascending in frequency: an interval in nm is turned round. */
export function intervalOffsetsGhz(
  input: IntervalInput,
  frame: FrequencyFrame,
): { readonly lowGhz: number; readonly highGhz: number } {
  const [unit, { low, high }] = unitOf<Range>(input);
  const ends = [offsetGhzOf(low, unit, frame), offsetGhzOf(high, unit, frame)] as const;
  return unit === 'wavelengthNm'
    ? { lowGhz: ends[1], highGhz: ends[0] }
    : { lowGhz: ends[0], highGhz: ends[1] };
}
