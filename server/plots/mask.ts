/** A mask as shaded ground a curve must not enter, in the frame of one plot. */
import type { MaskSpecification, OutputPort } from '../../src/filter/index.ts';
import { colourOf, outputWords } from './curves.ts';

export interface Frame {
  readonly left: number;
  readonly right: number;
  readonly bottomDb: number;
  readonly topDb: number;
}

/**
 * Where the words of a ground stand: along its demand where there is room; else beside an upper ground, under the curve,
 * and upwards in a lower one.
 */
export type WordsPlace = 'ALONG' | 'RIGHT' | 'LEFT' | 'UPWARDS';

/** One shaded rectangle with its demand, and where its words stand. */
export interface ForbiddenGround {
  readonly from: number;
  readonly to: number;
  readonly low: number;
  readonly high: number;
  readonly demandDb: number;
  readonly colour: string;
  /** The ground lies above its demand: the curve must stay below. */
  readonly above: boolean;
  readonly words: string;
  readonly place: WordsPlace;
  readonly wordsAt: number;
}

/** Bands of no width (a line) are drawn this wide, as a share of the frame. */
const LEAST_WIDTH = 0.008;
/** Share of the frame's width that one character of the labels takes. */
const CHARACTER_WIDTH = 0.0085;

/** Share of the frame's width that a line of text is high. */
const LINE_HEIGHT = 0.022;

/** dB with a true minus sign. */
function decibels(value: number): string {
  return `${String(Math.round(value * 100) / 100).replace('-', '\u2212')} dB`;
}

function fits(words: string, width: number, span: number): boolean {
  return width > words.length * CHARACTER_WIDTH * span;
}

function placeWords(
  words: string,
  above: boolean,
  from: number,
  to: number,
  frame: Frame,
): { place: WordsPlace; wordsAt: number } {
  const span = frame.right - frame.left;
  const length = words.length * CHARACTER_WIDTH * span;
  const middle = (from + to) / 2;
  if (fits(words, to - from, span)) return { place: 'ALONG', wordsAt: middle };
  if (above)
    return to + length > frame.right ? { place: 'LEFT', wordsAt: from } : { place: 'RIGHT', wordsAt: to };
  const beside = to - from > LINE_HEIGHT * span ? middle : to + (LINE_HEIGHT / 2) * span;
  return { place: 'UPWARDS', wordsAt: Math.min(beside, frame.right - (LINE_HEIGHT / 2) * span) };
}

/**
 * The response repeats every FSR and so do its bands: every image inside the frame is drawn.
 * @param peakDb level that demands relative to the peak are counted from, by output; null: nothing to count from.
 */
export function forbiddenGround(
  mask: MaskSpecification,
  fsrGhz: number,
  frame: Frame,
  peakDb: (output: OutputPort) => number | null,
): ForbiddenGround[] {
  const span = frame.right - frame.left;
  const twoOutputs = new Set(mask.bands.map((band) => band.output)).size > 1;
  return mask.bands.flatMap((band) => {
    const reference = mask.reference === 'PEAK' ? peakDb(band.output) : 0;
    if (reference === null) return [];
    const first = Math.ceil((frame.left - band.highGhz) / fsrGhz);
    const last = Math.floor((frame.right - band.lowGhz) / fsrGhz);
    const images: ForbiddenGround[] = [];
    for (let turn = first; turn <= last; turn++) {
      const spare = Math.max(0, LEAST_WIDTH * span - (band.highGhz - band.lowGhz)) / 2;
      const from = Math.max(frame.left, band.lowGhz + turn * fsrGhz - spare);
      const to = Math.min(frame.right, band.highGhz + turn * fsrGhz + spare);
      if (!(to > from)) continue;
      const ground = (demand: number, above: boolean): void => {
        const short = `${above ? '\u2264' : '\u2265'} ${decibels(demand)}${twoOutputs ? ` ${outputWords(band.output)}` : ''}`;
        const whole = band.label === undefined ? short : `${band.label} ${short}`;
        // Between crowded bands words beside a ground would run into the next one: without the label they often fit in it.
        const words =
          twoOutputs && !fits(whole, to - from, span) && fits(short, to - from, span) ? short : whole;
        images.push({
          ...{ from, to, words, above, demandDb: demand + reference, colour: colourOf(band.output) },
          low: above ? demand + reference : frame.bottomDb,
          high: above ? frame.topDb : demand + reference,
          ...placeWords(words, above, from, to, frame),
        });
      };
      if (band.maxTransmissionDb !== undefined) ground(band.maxTransmissionDb, true);
      if (band.minTransmissionDb !== undefined) ground(band.minTransmissionDb, false);
    }
    return images.filter(({ low, high }) => high > frame.bottomDb && low < frame.topDb && high > low);
  });
}
