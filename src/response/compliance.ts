/** Every demand of a mask against what the outputs transmit: the worst point of each band, and by how much. */
import type { Band, MaskSpecification, OutputPort } from '../filter/specification.ts';
import type { BandCompliance, Compliance } from './response.ts';
import type { FieldSource } from './source.ts';
import { powerExtremes, powerExtremesOverFsr, toDb } from './transmission.ts';

/** A margin is known this well: a design that touches its mask meets it. dB. */
const MARGIN_ACCURACY_DB = 1e-6;

function judge(index: number, band: Band, source: FieldSource, referenceDb: number): BandCompliance[] {
  const { greatest, least } = powerExtremes(source, band);
  const entries: BandCompliance[] = [];
  if (band.minTransmissionDb !== undefined) {
    const reached = toDb(least.value) - referenceDb;
    const margin = reached - band.minTransmissionDb;
    entries.push({
      index,
      band,
      quantity: 'MIN_TRANSMISSION_DB',
      demand: band.minTransmissionDb,
      reached,
      margin,
      met: margin >= -MARGIN_ACCURACY_DB,
      worstAtGhz: least.at,
    });
  }
  if (band.maxTransmissionDb !== undefined) {
    const reached = toDb(greatest.value) - referenceDb;
    const margin = band.maxTransmissionDb - reached;
    entries.push({
      index,
      band,
      quantity: 'MAX_TRANSMISSION_DB',
      demand: band.maxTransmissionDb,
      reached,
      margin,
      met: margin >= -MARGIN_ACCURACY_DB,
      worstAtGhz: greatest.at,
    });
  }
  return entries;
}

/**
 * Judges both outputs against a mask. Levels count against the light sent in, or, with reference PEAK, against the
 * greatest transmission of the band's own output over one FSR. A band wider than the FSR is judged over one FSR of it;
 * a band of no width is a line. Worst points are searched for between samples, to 1e-6 dB.
 * @throws RangeError for a mask without a demand
 */
export function complianceOf(
  sources: Readonly<Record<OutputPort, FieldSource>>,
  mask: MaskSpecification,
): Compliance {
  const peaks = new Map<OutputPort, number>();
  const referenceDbOf = (output: OutputPort): number => {
    if (mask.reference === 'INPUT') return 0;
    const known = peaks.get(output) ?? toDb(powerExtremesOverFsr(sources[output]).greatest.value);
    peaks.set(output, known);
    return known;
  };
  const bands = mask.bands.flatMap((band, index) =>
    judge(index, band, sources[band.output], referenceDbOf(band.output)),
  );
  if (bands.length === 0) throw new RangeError('the mask demands nothing');
  return {
    met: bands.every(({ met }) => met),
    reference: mask.reference,
    worstMarginDb: Math.min(...bands.map(({ margin }) => margin)),
    bands,
  };
}
