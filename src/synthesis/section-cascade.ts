/**
 * A classical filter as a cascade of first- and second-order sections, one cell each: two rings of mirrored poles in the
 * two arms and one arm phase, zeros exactly the filter's (section.ts). The cells are passive, so the cascade is
 * constant·H with |constant| ≤ 1; what the constant costs is reported, and `optimiseCascade` makes it smaller where a
 * mask leaves room.
 * Method: pole-zero pairing of second-order sections, L. B. Jackson, "Digital Filters and Signal Processing", 3rd ed.
 * (1996), chapter 11 (from memory).
 */
import { Complex } from 'complex.js';
import type { CircuitParameters, InterferometerParameters } from '../circuit/index.ts';
import { Refusal } from '../errors.ts';
import {
  type FilterSection,
  type OutputPort,
  type TransferFunction,
  transmissionAt,
} from '../filter/index.ts';
import { type Pairing, pairPolesWithZeros } from './pairing.ts';
import { greatestOnCircle } from './peak.ts';
import { cellWithNull, sectionOf } from './section.ts';
import { orderSections } from './section-order.ts';

export interface CascadeCell {
  readonly interferometer: InterferometerParameters;
  /** The output that carries the section and leads on. */
  readonly output: OutputPort;
  readonly section: FilterSection;
}

export interface SectionCascade {
  readonly cells: readonly CascadeCell[];
  /** The cascade's field is constant·H. */
  readonly constant: Complex;
  /** −(greatest transmission over the FSR), dB. */
  readonly insertionLossDb: number;
  /** Peak of the product of the first one, two, … sections, dB. */
  readonly partialPeaksDb: readonly number[];
  readonly pairing: Pick<Pairing, 'method' | 'considered' | 'spreadDb'>;
  /** How pairing and order were chosen, in one sentence. */
  readonly reason: string;
}

/** Sections that a filter of this order needs. */
export const sectionCount = (order: number): number => Math.ceil(order / 2);

/** Product of sections as one filter. */
export function productOf(sections: readonly FilterSection[]): TransferFunction {
  return {
    zeros: sections.flatMap((section) => section.zeros),
    poles: sections.flatMap((section) => section.poles),
    gain: sections.reduce((gain, section) => gain.mul(section.gain), new Complex(1, 0)),
  };
}

/** Throws a Refusal unless there is one output for each section. */
export function needsOutputs(outputs: readonly OutputPort[], order: number): void {
  if (order > 0 && outputs.length === sectionCount(order)) return;
  throw new Refusal({
    code: 'SPECIFICATION_UNREACHABLE',
    limit: 'RINGS',
    detail: `Order ${order} needs ${sectionCount(order)} cells in cascade; ${outputs.length} are given.`,
    given: outputs.length,
    allowed: sectionCount(order),
  });
}

/**
 * The cascade for a filter whose zeros lie on the circle, one output a cell in `outputs` (first cell first). Sections are
 * paired and ordered as the result says. Throws a Refusal where the number of cells is not that of the sections, for a
 * pole on or outside the circle, and for a filter that does not come apart.
 */
export function synthesiseSectionCascade(
  filter: TransferFunction,
  outputs: readonly OutputPort[],
): SectionCascade {
  needsOutputs(outputs, filter.poles.length);
  const pairing = pairPolesWithZeros(filter);
  const built = pairing.choices.map((choice) => ({
    poles: choice.poles.map((k) => filter.poles[k]!),
    zeros: choice.zeros.map((k) => filter.zeros[k]!),
  }));
  const realise = (part: (typeof built)[number], output: OutputPort): CascadeCell => {
    const interferometer = cellWithNull(part.poles, part.zeros[0]!, output);
    return { interferometer, output, section: sectionOf(interferometer, output, part.zeros) };
  };
  const ordered = orderSections(built.map((part) => realise(part, 'OUT2').section));
  const cells = ordered.order.map((index, place) => realise(built[index]!, outputs[place]!));
  const product = productOf(cells.map((cell) => cell.section));
  const peak = greatestOnCircle(product.poles, (omegaRad) => transmissionAt(product, omegaRad));
  const insertionLossDb = -10 * Math.log10(peak.value);
  const { method, considered, spreadDb } = pairing;
  const paired =
    method === 'ENUMERATED'
      ? considered === 1
        ? 'the only pairing'
        : `best of ${considered} pairings (${spreadDb.toFixed(2)} dB better than the worst)`
      : 'each pole pair with its nearest zeros, nearest the circle first';
  const placed =
    cells.length === 1
      ? 'one section'
      : ordered.considered > 1
        ? `best of ${ordered.considered} section orders`
        : 'sections by rising peakedness';
  return {
    cells,
    constant: product.gain.div(filter.gain),
    insertionLossDb,
    partialPeaksDb: ordered.partialPeaksDb,
    pairing: { method, considered, spreadDb },
    reason: `${paired}; ${placed}; passive sections cost ${Math.abs(insertionLossDb).toFixed(2)} dB in the passband.`,
  };
}

/**
 * The cells as one circuit. All cells but the last must lead on by the same output, since a chip joins them alike;
 * throws RangeError otherwise.
 */
export function circuitOfCascade(
  cells: readonly { readonly interferometer: InterferometerParameters; readonly output: OutputPort }[],
): CircuitParameters {
  const join = cells.length > 1 ? cells[0]!.output : cells.at(-1)!.output;
  if (cells.slice(0, -1).some((cell) => cell.output !== join))
    throw new RangeError('Cells of one circuit lead on by the same output.');
  return { cells: cells.map((cell) => cell.interferometer), join };
}
