/** Quantities as the wire tells them: every unit of a frequency, times in UTC, complex numbers as parallel lists. */
import { type FrequencyFrame, inUnit } from '../../schema/offsets.ts';
import type { ComplexValue } from '../../src/design/index.ts';

export interface OpticalFrequencyView {
  readonly frequencyThz: number;
  readonly wavelengthNm: number;
  readonly offsetGhz: number;
  readonly offsetFsr: number;
}

export function opticalFrequency(offsetGhz: number, frame: FrequencyFrame): OpticalFrequencyView {
  return {
    frequencyThz: inUnit(offsetGhz, 'frequencyThz', frame),
    wavelengthNm: inUnit(offsetGhz, 'wavelengthNm', frame),
    offsetGhz: 0 + offsetGhz,
    offsetFsr: inUnit(offsetGhz, 'offsetFsr', frame),
  };
}

/** RFC 3339, UTC, milliseconds. */
export function timeView(at: Date): string {
  return at.toISOString();
}

export function timeOrNull(at: Date | null): string | null {
  return at === null ? null : timeView(at);
}

export interface ComplexListView {
  readonly re: readonly number[];
  readonly im: readonly number[];
}

export function complexList(values: readonly ComplexValue[]): ComplexListView {
  return { re: values.map((value) => value.re), im: values.map((value) => value.im) };
}
