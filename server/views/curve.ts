/** Curves as JSON, CSV and Touchstone. */
import { FLOOR_DB } from '../../src/conventions.ts';
import { type Curve, designId } from '../operations/index.ts';
import type { ChipRecord, ChipRevisionRecord, DesignRecord } from '../store/records.ts';

/** The curve is in its wire shape already. */
export function responseJson(curve: Curve): Curve {
  return curve;
}

const CSV_HEADER =
  'frequencyThz,wavelengthNm,offsetGhz,fieldRe,fieldIm,transmissionDb,phaseRad,groupDelayPs,dispersionPsPerNm';

/** RFC 4180; numbers in their shortest exact form; an undefined value is an empty field. */
export function responseCsv(curve: Curve): string {
  const { frequencyThz, wavelengthNm, offsetGhz, field, transmissionDb, phaseRad } = curve;
  const lines = frequencyThz.map((frequency, i) =>
    [
      frequency,
      wavelengthNm[i],
      offsetGhz[i],
      field.re[i],
      field.im[i],
      transmissionDb[i],
      phaseRad[i],
      curve.groupDelayPs[i] ?? '',
      curve.dispersionPsPerNm[i] ?? '',
    ].join(','),
  );
  return `${[CSV_HEADER, ...lines].join('\r\n')}\r\n`;
}

export interface CurveOrigin {
  readonly design: Pick<DesignRecord, 'id'>;
  readonly chip: Pick<ChipRecord, 'serial'>;
  readonly revision: Pick<ChipRevisionRecord, 'number'>;
}

/** Ascending, and no two alike: the standard wants frequencies in increasing order. */
function risingPoints(curve: Curve): number[] {
  const points: number[] = [];
  let last = Number.NEGATIVE_INFINITY;
  curve.frequencyThz.forEach((frequency, i) => {
    if (frequency <= last) return;
    last = frequency;
    points.push(i);
  });
  return points;
}

/** GHz with the digits of whole hertz. */
function gigahertz(frequencyThz: number): string {
  return Number((frequencyThz * 1e3).toFixed(9)).toString();
}

/**
 * Touchstone file, version 1.1 (IBIS Open Forum, 2002): two ports, order S11 S21 S12 S22, port 1 the input, port 2 the
 * output asked for. Nothing reflects and the chip is reciprocal. The standard knows no THz.
 */
export function touchstone(curve: Curve, { design, chip, revision }: CurveOrigin): string {
  const head = [
    `! Design ${designId(design.id)}`,
    `! Chip ${chip.serial}, model revision ${revision.number}`,
    `! Stage ${curve.stage}, port 1 = in1, port 2 = ${curve.output.toLowerCase()}`,
    `! Fields vary as exp(+jwt); transmission below ${FLOOR_DB} dB is not told apart from nothing`,
    '# GHz S RI R 50',
  ];
  const rows = risingPoints(curve).map((i) => {
    const through = `${curve.field.re[i]} ${curve.field.im[i]}`;
    return `${gigahertz(curve.frequencyThz[i]!)} 0 0 ${through} ${through} 0 0`;
  });
  return `${[...head, ...rows].join('\n')}\n`;
}
