/** Curves, figures and compliance as the rest of the project sees them. */
import type { Band, TransmissionReference } from '../filter/specification.ts';

/** TARGET: transfer function. CIRCUIT: lossless circuit. CHIP: with loss. SETTING: as set, crosstalk and rounding in. */
export type Stage = 'TARGET' | 'CIRCUIT' | 'CHIP' | 'SETTING';

/** Complex field of one output at `offsetGhz` (ascending), and what follows from it. */
export interface Spectrum {
  readonly offsetGhz: Float64Array;
  readonly re: Float64Array;
  readonly im: Float64Array;
  /** −dφ/dω, ps. NaN where undefined (more than 60 dB below the peak). */
  readonly groupDelayPs: Float64Array;
  /** dτ/dν, ps/GHz. NaN where the delay is. */
  readonly groupDelaySlopePsPerGhz: Float64Array;
}

export interface Figures {
  readonly insertionLossDb: number | null;
  readonly rippleDb: number | null;
  readonly rejectionDb: number | null;
  readonly extinctionRatioDb: number | null;
  readonly bandwidth1DbGhz: number | null;
  readonly bandwidth3DbGhz: number | null;
  readonly bandwidth20DbGhz: number | null;
  /** −20 dB bandwidth / −1 dB bandwidth. */
  readonly shapeFactor: number | null;
  readonly groupDelayRipplePs: number | null;
  readonly worstNeighbourIsolationDb: number | null;
  /** One entry for every null above. */
  readonly notDefined: readonly { readonly figure: string; readonly reason: string }[];
}

export type Quantity = 'MIN_TRANSMISSION_DB' | 'MAX_TRANSMISSION_DB';

export interface BandCompliance {
  /** Position of `band` in the mask. */
  readonly index: number;
  readonly band: Band;
  readonly quantity: Quantity;
  readonly demand: number;
  readonly reached: number;
  /** dB inside (+) or outside (−) the demand. */
  readonly margin: number;
  readonly met: boolean;
  readonly worstAtGhz: number;
}

export interface Compliance {
  readonly met: boolean;
  /** What the dB of demands and levels count from. */
  readonly reference: TransmissionReference;
  readonly worstMarginDb: number;
  readonly bands: readonly BandCompliance[];
}
