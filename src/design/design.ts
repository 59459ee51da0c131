/** What a finished design holds: plain data, stored as JSON; circuit and setting are the truth, the rest a record made from them. */

import type { Setting } from '../chip/setting.ts';
import type { CircuitParameters } from '../circuit/circuit.ts';
import type {
  Architecture,
  Family,
  FilterSpecification,
  MaskSpecification,
  OutputPort,
} from '../filter/specification.ts';
import type { Compliance, Figures } from '../response/response.ts';

export interface ComplexValue {
  readonly re: number;
  readonly im: number;
}

export interface SectionRecord {
  readonly zeros: readonly ComplexValue[];
  readonly poles: readonly ComplexValue[];
  readonly gain: ComplexValue;
  readonly peakDb: number;
}

/** Product form of one output. */
export interface TransferFunctionRecord {
  readonly zeros: readonly ComplexValue[];
  readonly poles: readonly ComplexValue[];
  readonly gain: ComplexValue;
  readonly sections: readonly SectionRecord[];
}

export interface RingRecord {
  /** Element path without the quantity: `cell1.ring2`. */
  readonly element: string;
  readonly arm: 0 | 1;
  readonly powerCrossCoupling: number;
  readonly phaseRad: number;
  readonly parked: boolean;
}

export interface InterferometerRecord {
  readonly cell: string;
  /** Which section of the cascade the cell realises, from 1; null for the all-pass pair and for a parked cell. */
  readonly section: number | null;
  readonly inputCoupling: number;
  readonly outputCoupling: number;
  readonly armPhaseRad: number;
  readonly rings: readonly RingRecord[];
}

export interface Alternative {
  readonly family: Family | null;
  readonly architecture: Architecture;
  readonly order: number;
  readonly rings: number;
  readonly fits: boolean;
  readonly worstMarginDb: number | null;
  readonly insertionLossDb: number | null;
  readonly reason: string;
}

/** What a cascade would lose if its stopband might begin further out. */
export interface TradeOffRecord {
  /** Distance of the stopband's edges from the centre, GHz. */
  readonly stopEdgeGhz: number;
  /** Null where no cascade found keeps the other demands. */
  readonly insertionLossDb: number | null;
}

export interface Design {
  readonly order: number;
  readonly family: Family;
  readonly architecture: Architecture;
  /** One sentence: why this family, order and architecture. */
  readonly reason: string;
  readonly alternatives: readonly Alternative[];
  /** The output that carries the filter; the other one carries its complement. */
  readonly output: OutputPort;
  readonly transferFunctions: Readonly<Record<OutputPort, TransferFunctionRecord>>;
  readonly cells: readonly InterferometerRecord[];
  /** The lossless circuit with every parameter: what CIRCUIT simulates and the netlist is made of. */
  readonly circuit: CircuitParameters;
  readonly setting: Setting;
  /** Cascades of one or two sections with one passband: loss against stop edge, on this chip. Empty for pairs. */
  readonly tradeOff: readonly TradeOffRecord[];
  /** Middle of the passband, GHz from the reference frequency. */
  readonly centreGhz: number;
  /** What is judged: the mask asked for, or the one that the family's own parameters state. */
  readonly mask: MaskSpecification;
  readonly compliance: Compliance;
  /** Of the SETTING stage, at `output`. */
  readonly figures: Figures;
}

export interface DesignQuestion {
  readonly specification: FilterSpecification;
  readonly synthesis: { readonly architecture?: Architecture };
}
