/**
 * What is asked, in canonical form: every frequency is an offset in GHz from the chip's reference frequency, every
 * default is filled in, bands are sorted. `schema/` makes this from what a person sends; the core may assume it valid
 * in type and range but still refuses what physics refuses.
 */
export type Family = 'BUTTERWORTH' | 'CHEBYSHEV_I' | 'CHEBYSHEV_II' | 'ELLIPTIC';

/**
 * LOW_PASS: `band` passes, around `centreGhz`. HIGH_PASS: `band` is stopped, around `centreGhz`. BAND_PASS and
 * BAND_STOP: the same two around the middle of `band`, anywhere in the FSR (one band, order N, N rings).
 * INTERLEAVER: odd half-band, power symmetric, passes half the FSR around `centreGhz`.
 */
export type FilterShape = 'LOW_PASS' | 'HIGH_PASS' | 'BAND_PASS' | 'BAND_STOP' | 'INTERLEAVER';

/** The outputs of a whole circuit that a specification may name. */
export type OutputPort = 'OUT1' | 'OUT2';

export type Architecture = 'ALL_PASS_PAIR' | 'SECTION_CASCADE';

/** dB against the light sent in, or against the filter's own peak. */
export type TransmissionReference = 'INPUT' | 'PEAK';

export interface IntervalGhz {
  readonly lowGhz: number;
  readonly highGhz: number;
}

export interface FamilySpecification {
  readonly family: Family;
  readonly shape: FilterShape;
  /** Absent: the least order that meets `stopband` and `rejectionDb`. */
  readonly order?: number;
  readonly centreGhz: number;
  /** Between the edges of the family (design edges: −3.0103 dB, ripple edge or stopband edge). Absent for INTERLEAVER only. */
  readonly band?: IntervalGhz;
  /** An interval that must be stopped by `rejectionDb`; sets the order when that is absent. */
  readonly stopband?: IntervalGhz;
  readonly rippleDb?: number;
  readonly rejectionDb?: number;
  /** INTERLEAVER: channel spacing, half the FSR. */
  readonly gridGhz?: number;
  /** The output on which the filter's response is wanted. */
  readonly output: OutputPort;
}

export interface Band extends IntervalGhz {
  /** dB ≤ 0. At least one of the two is present. */
  readonly minTransmissionDb?: number;
  readonly maxTransmissionDb?: number;
  readonly output: OutputPort;
  readonly label?: string;
}

export interface MaskSpecification {
  readonly bands: readonly Band[];
  readonly family?: Family;
  readonly order?: number;
  readonly reference: TransmissionReference;
}

export type FilterSpecification =
  | { readonly family: FamilySpecification; readonly mask?: undefined }
  | { readonly mask: MaskSpecification; readonly family?: undefined };

export interface SynthesisChoice {
  /** Absent: the service chooses and says why. */
  readonly architecture?: Architecture;
}
