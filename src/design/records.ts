/** Scalars of the core as plain data that survives JSON. */
import type { Complex } from 'complex.js';
import type { PlacedCell } from '../chip/index.ts';
import type { FilterSection, TransferFunction } from '../filter/index.ts';
import type { ComplexValue, InterferometerRecord, SectionRecord, TransferFunctionRecord } from './design.ts';

const plainOf = ({ re, im }: Complex): ComplexValue => ({ re, im });

function sectionRecord({ zeros, poles, gain, peakDb }: FilterSection): SectionRecord {
  return { zeros: zeros.map(plainOf), poles: poles.map(plainOf), gain: plainOf(gain), peakDb };
}

export function transferFunctionRecord(
  filter: TransferFunction,
  sections: readonly FilterSection[],
): TransferFunctionRecord {
  return {
    zeros: filter.zeros.map(plainOf),
    poles: filter.poles.map(plainOf),
    gain: plainOf(filter.gain),
    sections: sections.map(sectionRecord),
  };
}

/** An output that no light is led to. */
export function darkRecord(): TransferFunctionRecord {
  return { zeros: [], poles: [], gain: { re: 0, im: 0 }, sections: [] };
}

export function cellRecord({
  cell,
  section,
  inputCoupling,
  outputCoupling,
  armPhaseRad,
  rings,
}: PlacedCell): InterferometerRecord {
  return {
    cell,
    section,
    inputCoupling,
    outputCoupling,
    armPhaseRad,
    rings: rings.map(({ element, arm, powerCrossCoupling, phaseRad, parked }) => ({
      element,
      arm,
      powerCrossCoupling,
      phaseRad,
      parked,
    })),
  };
}
