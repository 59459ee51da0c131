/** The response repeats every FSR: two bands that fall on the same point of it with contrary demands cannot both be met. */
import { Refusal } from '../../errors.ts';
import type { Band } from '../specification.ts';
import { arcOf, commonPoint, foldGhz } from './circle.ts';

const TURN = 2 * Math.PI;

export function refuseCollisions(bands: readonly Band[], fsrGhz: number): void {
  for (let i = 0; i < bands.length; i++) {
    for (let j = 0; j < bands.length; j++) {
      if (i !== j) refuseCollision(bands, i, j, fsrGhz);
    }
    refuseInverted(bands[i]!, i);
  }
}

function refuseInverted(band: Band, index: number): void {
  if (band.minTransmissionDb === undefined || (band.maxTransmissionDb ?? 0) >= band.minTransmissionDb) return;
  throw new Refusal({
    code: 'SPECIFICATION_INVALID',
    detail: `A contradiction: ${nameOf(band, index)} asks for at least ${band.minTransmissionDb} dB and at most ${band.maxTransmissionDb} dB.`,
    pointer: `/specification/mask/bands/${index}/maxTransmissionDb`,
    given: band.maxTransmissionDb,
    allowed: { min: band.minTransmissionDb, max: 0, unit: 'dB' },
  });
}

function refuseCollision(bands: readonly Band[], i: number, j: number, fsrGhz: number): void {
  const passing = bands[i]!;
  const other = bands[j]!;
  if (passing.minTransmissionDb === undefined) return;
  const angle = commonPoint(arcOf(passing, fsrGhz), arcOf(other, fsrGhz));
  if (angle === null) return;
  const offset = foldGhz((angle * fsrGhz) / TURN, fsrGhz);
  const place = `${Number(offset.toPrecision(9))} GHz of the free spectral range of ${fsrGhz} GHz`;
  if (passing.output === other.output) {
    if (other.maxTransmissionDb === undefined || other.maxTransmissionDb >= 0) return;
    throw new Refusal({
      code: 'BANDS_COLLIDE',
      limit: 'FREE_SPECTRAL_RANGE',
      detail:
        `Contrary demands meet: ${nameOf(passing, i)} asks for at least ${passing.minTransmissionDb} dB and ${nameOf(other, j)} for at most ` +
        `${other.maxTransmissionDb} dB, and both fall on ${place}: the response repeats every free spectral range, so ` +
        'no filter on this chip can tell them apart.',
      pointer: `/specification/mask/bands/${j}`,
      given: { bands: [i, j], commonOffsetGhz: offset },
      allowed: 'bands whose positions, taken modulo the free spectral range, do not meet',
      nearest: [
        {
          reason: `without ${nameOf(other, j)}`,
          changes: [{ pointer: `/specification/mask/bands/${j}`, given: other, works: null }],
        },
      ],
    });
  }
  refuseTogether(passing, i, other, j, place);
}

/** Least demands on both outputs at one place need more light than was sent in. */
function refuseTogether(a: Band, i: number, b: Band, j: number, place: string): void {
  if (b.minTransmissionDb === undefined || i > j) return;
  const share = 10 ** (a.minTransmissionDb! / 10) + 10 ** (b.minTransmissionDb / 10);
  if (share <= 1) return;
  throw new Refusal({
    code: 'SPECIFICATION_UNREACHABLE',
    limit: 'PASSIVITY',
    detail:
      `More light is asked for than there is: ${nameOf(a, i)} and ${nameOf(b, j)} both fall on ${place} and together ask for ${(share * 100).toFixed(1)} % of the ` +
      'light that was sent in; a passive chip has 100 %.',
    pointer: `/specification/mask/bands/${j}/minTransmissionDb`,
    given: b.minTransmissionDb,
    allowed: 'least transmissions of the two outputs that sum to 1 at the most',
    nearest: [
      {
        reason: `without ${nameOf(b, j)}`,
        changes: [{ pointer: `/specification/mask/bands/${j}`, given: b, works: null }],
      },
    ],
  });
}

/** Positions are those of the canonical list; whoever shows the text puts the asker's own in their place. */
function nameOf(band: Band, index: number): string {
  return band.label === undefined ? `band ${index}` : `"${band.label}" (band ${index})`;
}
