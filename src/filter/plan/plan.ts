import type { Family, MaskSpecification, OutputPort } from '../specification.ts';
import type { LabelledFilter, TransferFunction } from '../transfer-function.ts';

/** The greatest order a specification may ask for; the core is checked to it against published designs. */
export const MAX_DESIGN_ORDER = 16;

/**
 * Every classical demand with one passband per FSR, brought to a low-pass around the middle of the passband: a
 * high-pass or band-stop around Ω_c is the low-pass around Ω_c + π.
 */
export interface OneBandDemand {
  /** Middle of the passband, Ω in rad from the reference frequency. */
  readonly centreRad: number;
  /** Half-width of what must pass, in (0, π). */
  readonly passEdgeRad: number;
  /** Allowance within the passband, dB > 0. */
  readonly rippleDb: number;
  /** Distances from the centre from which on so much must be rejected; ascending in distance. */
  readonly stops: readonly StopDemand[];
}

export interface StopDemand {
  readonly edgeRad: number;
  readonly rejectionDb: number;
}

/** One filter that answers a specification; `filter` is the response wanted at `output`. */
export interface FilterPlan {
  readonly family: Family;
  readonly order: number;
  readonly output: OutputPort;
  readonly centreRad: number;
  readonly passEdgeRad: number;
  /** Where the rejection demanded begins; null where nothing is demanded beyond the family's own shape. */
  readonly stopEdgeRad: number | null;
  readonly rippleDb: number;
  readonly rejectionDb: number | null;
  readonly filter: LabelledFilter;
  /** What the other output of a lossless pair carries; worked out when asked for. */
  readonly complement: () => TransferFunction;
  /** What is judged. */
  readonly mask: MaskSpecification;
}

/** The greatest order worth designing for a chip, and what sets it: the core's own bound or the chip's rings. */
export interface Capacity {
  /** Of any filter; 0 where none fits. */
  readonly order: number;
  /** Of an odd half-band filter, whose pole at 0 may be a plain delay; at least what `order` allows. */
  readonly halfBandOrder: number;
  readonly limit: 'ORDER' | 'RINGS';
}

export const FAMILIES: readonly Family[] = ['BUTTERWORTH', 'CHEBYSHEV_I', 'CHEBYSHEV_II', 'ELLIPTIC'];

/** What one family can do about a specification. */
export interface FamilyPlans {
  readonly family: Family;
  /** Least order that meets the demand; null beyond what is designed. */
  readonly leastOrder: number | null;
  /** Within capacity, cheapest first; empty when none is. */
  readonly plans: readonly FilterPlan[];
}
