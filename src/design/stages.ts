/** A stored design seen again: every curve and figure is recomputed from its circuit and setting, never remembered. */
import { Complex } from 'complex.js';
import { type ChipModel, circuitOfSetting, withChipLosses } from '../chip/index.ts';
import { type Netlist, netlistOf } from '../circuit/index.ts';
import { FLOOR_DB } from '../conventions.ts';
import type { IntervalGhz, OutputPort, TransferFunction } from '../filter/index.ts';
import {
  type Compliance,
  complianceOf,
  dispersionPsPerNm,
  type Figures,
  gapsOf,
  phaseRad,
  type Spectrum,
  type Stage,
  sourceOfTransferFunction,
  spectrumOf,
  transmissionDb,
} from '../response/index.ts';
import type { ComplexValue, Design, TransferFunctionRecord } from './design.ts';
import { figureBands, figuresFrom, type Sources, sourcesOf } from './judge.ts';

const complexOf = ({ re, im }: ComplexValue): Complex => new Complex(re, im);

/** The stored product form as the filter core reads it. */
function transferFunctionOf(record: TransferFunctionRecord): TransferFunction {
  return {
    zeros: record.zeros.map(complexOf),
    poles: record.poles.map(complexOf),
    gain: complexOf(record.gain),
  };
}

/** Both outputs of a design at a stage. */
function stageSources(design: Design, chip: ChipModel, stage: Stage): Sources {
  switch (stage) {
    case 'TARGET':
      return {
        OUT1: sourceOfTransferFunction(transferFunctionOf(design.transferFunctions.OUT1), chip.fsrGhz),
        OUT2: sourceOfTransferFunction(transferFunctionOf(design.transferFunctions.OUT2), chip.fsrGhz),
      };
    case 'CIRCUIT':
      return sourcesOf(design.circuit, chip.fsrGhz);
    case 'CHIP':
      return sourcesOf(withChipLosses(design.circuit, chip), chip.fsrGhz);
    case 'SETTING':
      return sourcesOf(circuitOfSetting(design.setting, chip), chip.fsrGhz);
  }
}

/** A curve over ascending offsets; NaN in delay and dispersion exactly within `gaps`. */
export interface DesignCurve {
  readonly spectrum: Spectrum;
  /** Never below `FLOOR_DB`. */
  readonly transmissionDb: Float64Array;
  readonly phaseRad: Float64Array;
  readonly dispersionPsPerNm: Float64Array;
  readonly gaps: readonly IntervalGhz[];
}

/** The curve of one output at a stage. Cost: points × rings. */
export function curveOf(
  design: Design,
  chip: ChipModel,
  stage: Stage,
  output: OutputPort,
  offsetGhz: Float64Array,
): DesignCurve {
  const spectrum = spectrumOf(stageSources(design, chip, stage)[output], offsetGhz);
  return {
    spectrum,
    transmissionDb: transmissionDb(spectrum).map((level) => Math.max(level, FLOOR_DB)),
    phaseRad: phaseRad(spectrum),
    dispersionPsPerNm: dispersionPsPerNm(spectrum, chip.referenceFrequencyThz),
    gaps: gapsOf(spectrum),
  };
}

/** Figures of one output at a stage, over the bands of the design's mask. */
export function stageFigures(design: Design, chip: ChipModel, stage: Stage, output: OutputPort): Figures {
  const bands = figureBands(design.mask, output, design.output, design.centreGhz, chip.fsrGhz);
  return figuresFrom(stageSources(design, chip, stage), output, bands);
}

/** The design's mask judged again at a stage. */
export function stageCompliance(design: Design, chip: ChipModel, stage: Stage): Compliance {
  return complianceOf(stageSources(design, chip, stage), design.mask);
}

/** The lossless circuit as a flat netlist, ids from the chip's cell names. */
export function netlistOfDesign(design: Design): Netlist {
  return netlistOf(
    design.circuit,
    design.cells.map((cell) => cell.cell),
  );
}
