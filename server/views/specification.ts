/** The canonical specification in every unit of the chip it was asked for. */
import type { FrequencyFrame } from '../../schema/offsets.ts';
import type {
  Band,
  FamilySpecification,
  FilterSpecification,
  IntervalGhz,
  MaskSpecification,
} from '../../src/filter/index.ts';
import { type OpticalFrequencyView, opticalFrequency } from './quantities.ts';

export interface IntervalView {
  readonly low: OpticalFrequencyView;
  readonly high: OpticalFrequencyView;
}

export interface BandView {
  readonly index: number;
  readonly label: string | null;
  readonly interval: IntervalView;
  readonly minTransmissionDb: number | null;
  readonly maxTransmissionDb: number | null;
  readonly output: Band['output'];
}

export interface FamilySpecificationView {
  readonly family: FamilySpecification['family'];
  readonly shape: FamilySpecification['shape'];
  readonly order: number | null;
  readonly centre: OpticalFrequencyView;
  readonly band: IntervalView | null;
  readonly stopband: IntervalView | null;
  readonly rippleDb: number | null;
  readonly rejectionDb: number | null;
  readonly gridGhz: number | null;
  readonly output: FamilySpecification['output'];
}

export interface MaskSpecificationView {
  readonly bands: readonly BandView[];
  readonly family: MaskSpecification['family'] | null;
  readonly order: number | null;
  readonly reference: MaskSpecification['reference'];
}

/** A mask has `bands`, a family `shape`: which of the two it is shows in the members. */
export type FilterSpecificationView = FamilySpecificationView | MaskSpecificationView;

function intervalView(interval: IntervalGhz, frame: FrequencyFrame): IntervalView {
  return {
    low: opticalFrequency(interval.lowGhz, frame),
    high: opticalFrequency(interval.highGhz, frame),
  };
}

export function bandView(band: Band, index: number, frame: FrequencyFrame): BandView {
  return {
    index,
    label: band.label ?? null,
    interval: intervalView(band, frame),
    minTransmissionDb: band.minTransmissionDb ?? null,
    maxTransmissionDb: band.maxTransmissionDb ?? null,
    output: band.output,
  };
}

function familyView(spec: FamilySpecification, frame: FrequencyFrame): FamilySpecificationView {
  return {
    family: spec.family,
    shape: spec.shape,
    order: spec.order ?? null,
    centre: opticalFrequency(spec.centreGhz, frame),
    band: spec.band ? intervalView(spec.band, frame) : null,
    stopband: spec.stopband ? intervalView(spec.stopband, frame) : null,
    rippleDb: spec.rippleDb ?? null,
    rejectionDb: spec.rejectionDb ?? null,
    gridGhz: spec.gridGhz ?? null,
    output: spec.output,
  };
}

export function specificationView(
  specification: FilterSpecification,
  frame: FrequencyFrame,
): FilterSpecificationView {
  if (specification.family !== undefined) return familyView(specification.family, frame);
  const { bands, family, order, reference } = specification.mask;
  return {
    bands: bands.map((band, index) => bandView(band, index, frame)),
    family: family ?? null,
    order: order ?? null,
    reference,
  };
}
