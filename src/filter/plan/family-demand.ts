/** The family form of a specification: which parameters a family and shape take, and the low-pass they describe. */
import { Refusal } from '../../errors.ts';
import { MIN_RIPPLE_DB } from '../guards.ts';
import type { Family, FamilySpecification } from '../specification.ts';
import { arcOf, distanceRad, insideHalfTurn } from './circle.ts';

const TURN = 2 * Math.PI;

/** How far, in FSR, a band's middle may lie from the stated centre and still count as centred: rounding of units. */
const CENTRE_TOLERANCE_FSR = 1e-9;

const AT = '/specification/family';

/** The family form as a low-pass: half-widths and distances from the middle of what passes, in Ω. */
export interface FamilyGeometry {
  readonly centreRad: number;
  /** The family's design edge as `band` states it. */
  readonly bandEdgeRad: number;
  /** Distance at which `stopband` begins; null when none is given. */
  readonly stopEdgeRad: number | null;
}

export function invalid(
  member: string,
  detail: string,
  given: unknown,
  allowed: unknown,
  works?: { reason: string; value: unknown; unit?: string },
): never {
  const pointer = `${AT}/${member}`;
  throw new Refusal({
    code: 'SPECIFICATION_INVALID',
    detail,
    pointer,
    given: given ?? null,
    allowed,
    ...(works
      ? {
          nearest: [
            {
              reason: works.reason,
              changes: [
                {
                  pointer,
                  given: given ?? null,
                  works: works.value,
                  ...(works.unit ? { unit: works.unit } : {}),
                },
              ],
            },
          ],
        }
      : {}),
  });
}

const NEEDS_RIPPLE: readonly Family[] = ['CHEBYSHEV_I', 'ELLIPTIC'];
const NEEDS_REJECTION: readonly Family[] = ['CHEBYSHEV_II', 'ELLIPTIC'];

/** Refuses what is missing and what would be silently ignored. */
export function requireParameters(spec: FamilySpecification): void {
  const { family } = spec;
  if (spec.shape === 'INTERLEAVER') return;
  if (spec.gridGhz !== undefined)
    invalid('gridGhz', 'A channel grid belongs to an INTERLEAVER.', spec.gridGhz, 'absent', {
      reason: 'without it',
      value: null,
    });
  if (!spec.band)
    invalid(
      'band',
      `${spec.shape} needs the band between its edges.`,
      null,
      'an interval within one free spectral range',
    );
  if (NEEDS_RIPPLE.includes(family) && spec.rippleDb === undefined) {
    invalid(
      'rippleDb',
      `${family} needs its ripple.`,
      null,
      { above: 0, unit: 'dB' },
      { reason: 'a ripple of 0.5 dB', value: 0.5, unit: 'dB' },
    );
  }
  if (spec.rippleDb !== undefined && spec.rippleDb < MIN_RIPPLE_DB) {
    invalid(
      'rippleDb',
      `A ripple below ${MIN_RIPPLE_DB} dB is lost in rounding.`,
      spec.rippleDb,
      { min: MIN_RIPPLE_DB, unit: 'dB' },
      { reason: 'the least ripple', value: MIN_RIPPLE_DB, unit: 'dB' },
    );
  }
  if (NEEDS_REJECTION.includes(family) && spec.rejectionDb === undefined) {
    invalid(
      'rejectionDb',
      `${family} needs its rejection.`,
      null,
      { above: 0, unit: 'dB' },
      { reason: 'a rejection of 30 dB', value: 30, unit: 'dB' },
    );
  }
  if (family === 'ELLIPTIC' && spec.rejectionDb! <= spec.rippleDb!) {
    invalid(
      'rejectionDb',
      'The rejection must be greater than the ripple.',
      spec.rejectionDb,
      { above: spec.rippleDb, unit: 'dB' },
      { reason: 'a rejection of 30 dB', value: 30, unit: 'dB' },
    );
  }
  if (spec.order === undefined) requireOrderData(spec);
  refuseUnused(spec);
}

function requireOrderData(spec: FamilySpecification): void {
  if (!spec.stopband)
    invalid(
      'order',
      'Without an order, the stopband and rejectionDb must say what the filter has to reach.',
      null,
      'an order, or stopband and rejectionDb',
    );
  if (spec.rejectionDb === undefined) {
    invalid(
      'rejectionDb',
      'Without an order, the stopband needs its rejection.',
      null,
      { above: 0, unit: 'dB' },
      { reason: 'a rejection of 30 dB', value: 30, unit: 'dB' },
    );
  }
  if (spec.family === 'CHEBYSHEV_II' && spec.rippleDb === undefined) {
    invalid(
      'rippleDb',
      'Without an order, CHEBYSHEV_II needs what may be lost within the band.',
      null,
      { above: 0, unit: 'dB' },
      { reason: 'an allowance of 0.5 dB', value: 0.5, unit: 'dB' },
    );
  }
}

function refuseUnused(spec: FamilySpecification): void {
  const rippleUnused =
    spec.rippleDb !== undefined &&
    (spec.family === 'BUTTERWORTH' || (spec.family === 'CHEBYSHEV_II' && !spec.stopband));
  if (rippleUnused) {
    const why =
      spec.family === 'BUTTERWORTH'
        ? "BUTTERWORTH's edges are its −3.0103 dB points"
        : 'without a stopband, the edges of CHEBYSHEV_II are those of its stopband';
    invalid('rippleDb', `${why}; a ripple would have no effect.`, spec.rippleDb, 'absent', {
      reason: 'without it',
      value: null,
    });
  }
  if (spec.rejectionDb !== undefined && !spec.stopband && !NEEDS_REJECTION.includes(spec.family)) {
    invalid(
      'rejectionDb',
      `${spec.family} has no rejection of its own; a rejection needs the stopband in which it is demanded.`,
      spec.rejectionDb,
      'absent, or with a stopband',
      { reason: 'without it', value: null },
    );
  }
  if (spec.stopband && spec.rejectionDb === undefined) {
    invalid(
      'rejectionDb',
      'A stopband needs its rejection.',
      null,
      { above: 0, unit: 'dB' },
      { reason: 'a rejection of 30 dB', value: 30, unit: 'dB' },
    );
  }
}

/** Whether the band between the edges is what is stopped. */
function stopsBand(spec: FamilySpecification): boolean {
  return spec.shape === 'HIGH_PASS' || spec.shape === 'BAND_STOP';
}

export function geometryOf(spec: FamilySpecification, fsrGhz: number): FamilyGeometry {
  const band = spec.band!;
  const width = band.highGhz - band.lowGhz;
  if (!(width > 0 && width < fsrGhz)) {
    throw new Refusal({
      code: 'SPECIFICATION_INVALID',
      limit: 'FREE_SPECTRAL_RANGE',
      detail: `The band is ${width} GHz wide; it must be wider than 0 and narrower than the free spectral range of ${fsrGhz} GHz, beyond which the response repeats.`,
      pointer: `${AT}/band`,
      given: band,
      allowed: { aboveWidth: 0, belowWidth: fsrGhz, unit: 'GHz' },
      nearest: [
        {
          reason: 'half the free spectral range, around the centre',
          changes: [
            {
              pointer: `${AT}/band`,
              given: band,
              works: centred(spec.centreGhz, fsrGhz / 4),
              unit: 'GHz',
            },
          ],
        },
      ],
    });
  }
  const middleGhz = (band.lowGhz + band.highGhz) / 2;
  if (Math.abs(middleGhz - spec.centreGhz) > CENTRE_TOLERANCE_FSR * fsrGhz) {
    invalid(
      'band',
      `The band's middle lies at ${middleGhz} GHz, the centre at ${spec.centreGhz} GHz. ${spec.shape} is symmetric about its centre; BAND_PASS and BAND_STOP lie around any.`,
      band,
      'a band around the centre',
      {
        reason: 'the same width around the centre',
        value: centred(spec.centreGhz, width / 2),
        unit: 'GHz',
      },
    );
  }
  const inverted = stopsBand(spec);
  const centreRad = (TURN * spec.centreGhz) / fsrGhz + (inverted ? Math.PI : 0);
  const half = (Math.PI * width) / fsrGhz;
  const bandEdgeRad = inverted ? Math.PI - half : half;
  const stopEdgeRad = spec.stopband
    ? insideHalfTurn(distanceRad(centreRad, arcOf(spec.stopband, fsrGhz)), bandEdgeRad)
    : null;
  return { centreRad, bandEdgeRad, stopEdgeRad };
}

function centred(centreGhz: number, halfGhz: number): { lowGhz: number; highGhz: number } {
  return { lowGhz: centreGhz - halfGhz, highGhz: centreGhz + halfGhz };
}
