/** Choice of a representation: a suffix of the path beats `Accept` (RFC 9110 section 12.5.1), and JSON is the default. */

export interface Representation {
  /** Suffix without the point. */
  readonly suffix: string;
  /** Type and subtype, without parameters. */
  readonly mediaType: string;
}

interface Range {
  readonly type: string;
  readonly quality: number;
}

function parseAccept(header: string): Range[] {
  return header.split(',').map((part) => {
    const [type = '', ...parameters] = part.split(';').map((piece) => piece.trim().toLowerCase());
    const quality = parameters.find((parameter) => /^q\s*=/.test(parameter));
    const value = quality ? Number(quality.replace(/^q\s*=\s*/, '')) : 1;
    return { type, quality: Number.isFinite(value) ? Math.min(Math.max(value, 0), 1) : 0 };
  });
}

/** Quality of the most specific range that covers the type; 0 when none does. */
function qualityOf(mediaType: string, ranges: readonly Range[]): number {
  const whole = `${mediaType.split('/')[0]}/*`;
  for (const wanted of [mediaType, whole, '*/*']) {
    const found = ranges.find((range) => range.type === wanted);
    if (found) return found.quality;
  }
  return 0;
}

/** The offer that `Accept` likes best, the earlier offer at equal liking; null when it accepts none (406). */
export function negotiate<T extends Representation>(
  accept: string | undefined,
  offers: readonly T[],
): T | null {
  const first = offers[0];
  if (!first) return null;
  if (accept === undefined || accept.trim() === '' || accept === '*/*') return first;
  const ranges = parseAccept(accept);
  let best: T | null = null;
  let bestQuality = 0;
  for (const offer of offers) {
    const quality = qualityOf(offer.mediaType, ranges);
    if (quality > bestQuality) {
      best = offer;
      bestQuality = quality;
    }
  }
  return best;
}

/** Splits `current.csv` into `current` and `csv` when the suffix is one of those offered. */
export function splitSuffix(
  segment: string,
  offers: readonly Representation[],
): { readonly stem: string; readonly suffix: string | null } {
  const point = segment.lastIndexOf('.');
  const suffix = point > 0 ? segment.slice(point + 1) : '';
  return offers.some((offer) => offer.suffix === suffix)
    ? { stem: segment.slice(0, point), suffix }
    : { stem: segment, suffix: null };
}
