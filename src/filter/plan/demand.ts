/**
 * A mask as one low-pass demand: which output is the filter's, what must pass, what must be stopped, and the centre
 * that leaves the easiest transition.
 */
import { Refusal } from '../../errors.ts';
import type { Band, MaskSpecification, OutputPort } from '../specification.ts';
import { type Arc, arcOf, foldRad, insideHalfTurn, LINE_SHARE } from './circle.ts';
import { refuseCollisions } from './collisions.ts';
import type { OneBandDemand, StopDemand } from './plan.ts';

const TURN = 2 * Math.PI;

/** Allowances smaller than this are lost in the rounding of the figures that are judged, dB. */
const LEAST_ALLOWANCE_DB = 1e-6;

/** A band as the filter's own output must show it: lossless outputs sum to 1, so each states the other's. */
export interface OwnBand {
  /** Position in the mask. */
  readonly index: number;
  readonly arc: Arc;
  readonly kind: 'PASS' | 'STOP';
  /** PASS: allowance below the peak; STOP: rejection. dB > 0. */
  readonly levelDb: number;
}

export interface MaskDemand {
  readonly demand: OneBandDemand;
  readonly output: OutputPort;
  readonly own: readonly OwnBand[];
}

/** The level that the other output of a lossless circuit has when this one has `levelDb` (both ≤ 0 dB). */
export function complementDb(levelDb: number): number {
  return (10 * Math.log1p(-(10 ** (levelDb / 10)))) / Math.LN10;
}

export function demandOfMask(mask: MaskSpecification, fsrGhz: number): MaskDemand {
  requireBands(mask);
  refuseCollisions(mask.bands, fsrGhz);
  const output = ownOutput(mask.bands);
  const own = mask.bands.flatMap((band, index) => ownBands(band, index, output, fsrGhz));
  requireStop(own, output);
  return { demand: lowPassOf(own), output, own };
}

function requireBands(mask: MaskSpecification): void {
  const passes = mask.bands.some((band) => band.minTransmissionDb !== undefined);
  const stops = mask.bands.some((band) => (band.maxTransmissionDb ?? 0) < 0);
  if (passes && stops) return;
  const [missing, member] = passes
    ? ['stopband', 'maxTransmissionDb below 0 dB']
    : ['passband', 'minTransmissionDb'];
  throw new Refusal({
    code: 'SPECIFICATION_INVALID',
    detail: `The mask has no ${missing}: at least one band needs ${member}.`,
    pointer: '/specification/mask/bands',
    allowed: `at least one band with ${member}`,
  });
}

/** A stop on the other output is a pass on this one: with those alone a plain guide would do. */
function requireStop(own: readonly OwnBand[], output: OutputPort): void {
  if (own.some((band) => band.kind === 'STOP')) return;
  const other = output === 'OUT1' ? 'OUT2' : 'OUT1';
  throw new Refusal({
    code: 'SPECIFICATION_INVALID',
    detail:
      `The mask has no stopband for ${output}: what must not reach ${other} must reach ${output}, so every band ` +
      `asks light to come out at ${output}. At least one band needs maxTransmissionDb below 0 dB on ${output}, or ` +
      `minTransmissionDb on ${other}.`,
    pointer: '/specification/mask/bands',
    allowed: `at least one band with maxTransmissionDb on ${output} or minTransmissionDb on ${other}`,
  });
}

/** The filter falls on the output that must pass something; where both must, on the one asked for first. */
function ownOutput(bands: readonly Band[]): OutputPort {
  return bands.find((band) => band.minTransmissionDb !== undefined)?.output ?? 'OUT1';
}

function ownBands(band: Band, index: number, output: OutputPort, fsrGhz: number): OwnBand[] {
  const arc = arcOf(band, fsrGhz);
  const here = band.output === output;
  const list: OwnBand[] = [];
  if (band.minTransmissionDb !== undefined) {
    requireBelowZero(band.minTransmissionDb, index);
    const level = here ? -band.minTransmissionDb : -complementDb(band.minTransmissionDb);
    list.push({ index, arc, kind: here ? 'PASS' : 'STOP', levelDb: level });
  }
  if (band.maxTransmissionDb !== undefined && band.maxTransmissionDb < 0) {
    const level = here ? -band.maxTransmissionDb : -complementDb(band.maxTransmissionDb);
    list.push({ index, arc, kind: here ? 'STOP' : 'PASS', levelDb: level });
  }
  return list;
}

function requireBelowZero(minTransmissionDb: number, index: number): void {
  if (minTransmissionDb <= -LEAST_ALLOWANCE_DB) return;
  throw new Refusal({
    code: 'SPECIFICATION_UNREACHABLE',
    limit: 'PASSIVITY',
    detail:
      'A passive chip passes 0 dB at single frequencies at the most; over a band it needs an allowance.',
    pointer: `/specification/mask/bands/${index}/minTransmissionDb`,
    given: minTransmissionDb,
    allowed: { max: -LEAST_ALLOWANCE_DB, unit: 'dB' },
    nearest: [
      {
        reason: 'an allowance of 0.1 dB',
        changes: [
          {
            pointer: `/specification/mask/bands/${index}/minTransmissionDb`,
            given: minTransmissionDb,
            works: -0.1,
            unit: 'dB',
          },
        ],
      },
    ],
  });
}

function lowPassOf(own: readonly OwnBand[]): OneBandDemand {
  const { passLowRad, passHighRad, stopAboveRad, stopBelowRad } = transitionOf(own);
  if (stopAboveRad <= passHighRad || stopBelowRad >= passLowRad) refuseNoTransition(own);
  const centreRad = easiestCentre(passLowRad, passHighRad, stopBelowRad, stopAboveRad);
  const raw = Math.max(centreRad - passLowRad, passHighRad - centreRad);
  const nearest = Math.min(stopAboveRad - centreRad, centreRad - stopBelowRad);
  const stops = own
    .filter((band) => band.kind === 'STOP')
    .map((band) => ({ edgeRad: edgeOf(band.arc, centreRad), rejectionDb: band.levelDb }));
  return {
    centreRad: centreRad - TURN * Math.round(centreRad / TURN),
    passEdgeRad: Math.max(raw, LINE_SHARE * nearest),
    rippleDb: Math.min(...own.filter((band) => band.kind === 'PASS').map((band) => band.levelDb)),
    stops: mergeStops(stops.map((stop) => ({ ...stop, edgeRad: insideHalfTurn(stop.edgeRad, raw) }))),
  };
}

function edgeOf(arc: Arc, centreRad: number): number {
  const ahead = foldRad(arc.startRad - centreRad);
  return Math.min(ahead, TURN - ahead - arc.lengthRad);
}

function mergeStops(stops: readonly StopDemand[]): StopDemand[] {
  const sorted = [...stops].sort((a, b) => a.edgeRad - b.edgeRad || b.rejectionDb - a.rejectionDb);
  return sorted.filter((stop, i) => sorted.findIndex((other) => other.edgeRad === stop.edgeRad) === i);
}

interface Transition {
  readonly passLowRad: number;
  readonly passHighRad: number;
  /** Nearest stopped points above and below the passband, unrolled so that below < low ≤ high < above. */
  readonly stopAboveRad: number;
  readonly stopBelowRad: number;
}

/** Walks once around the FSR and demands that passbands and stopbands form one group each. */
function transitionOf(own: readonly OwnBand[]): Transition {
  const origin = own.find((band) => band.kind === 'STOP')!.arc.startRad;
  const around = own
    .map((band) => ({
      kind: band.kind,
      low: foldRad(band.arc.startRad - origin),
      length: band.arc.lengthRad,
      index: band.index,
    }))
    .sort((a, b) => a.low - b.low || (a.kind === 'STOP' ? -1 : 1));
  const first = around.findIndex((band) => band.kind === 'PASS');
  const last = around.findLastIndex((band) => band.kind === 'PASS');
  const between = around.slice(first, last + 1).find((band) => band.kind === 'STOP');
  if (between) refuseSeveralPassbands(between.index);
  const passes = around.slice(first, last + 1);
  const passLow = around[first]!.low;
  const passHigh = Math.max(...passes.map((band) => band.low + band.length));
  const below = Math.max(...around.slice(0, first).map((band) => band.low + band.length));
  const above = last + 1 < around.length ? around[last + 1]!.low : TURN;
  const wrapped = Math.max(...around.slice(last + 1).map((band) => band.low + band.length - TURN), below);
  return {
    passLowRad: passLow + origin,
    passHighRad: passHigh + origin,
    stopAboveRad: above + origin,
    stopBelowRad: wrapped + origin,
  };
}

function refuseSeveralPassbands(index: number): never {
  throw new Refusal({
    code: 'SPECIFICATION_UNREACHABLE',
    detail:
      'The mask alternates more than once between passing and stopping within one FSR. These filter families have one ' +
      'passband and one stopband per FSR.',
    pointer: `/specification/mask/bands/${index}`,
    allowed: 'one group of passbands and one of stopbands per FSR, on the circle that the FSR is',
  });
}

function refuseNoTransition(own: readonly OwnBand[]): never {
  const stop = own.find((band) => band.kind === 'STOP')!;
  throw new Refusal({
    code: 'SPECIFICATION_UNREACHABLE',
    limit: 'ORDER',
    detail:
      'A passband and a stopband meet without a transition between them (bands of the other output count as their ' +
      'complement: what must not reach one output must reach the other). No finite order does that.',
    pointer: `/specification/mask/bands/${stop.index}`,
    allowed: 'bands with room between what passes and what is stopped',
  });
}

/** Steps of the coarse search and of the golden-section refinement; 60 halve the bracket below 1e-12 of its width. */
const CENTRE_STEPS = 64;
const CENTRE_REFINEMENTS = 60;

/** The centre with the least tan(Ωp/2)/tan(Ωs/2), the selectivity every family's order grows with. */
function easiestCentre(passLow: number, passHigh: number, stopBelow: number, stopAbove: number): number {
  const middle = (passLow + passHigh) / 2;
  const selectivity = (centre: number): number => {
    const pass = Math.max(centre - passLow, passHigh - centre);
    const stop = Math.min(stopAbove - centre, centre - stopBelow, Math.PI);
    return stop <= pass ? Number.POSITIVE_INFINITY : Math.tan(pass / 2) / Math.tan(stop / 2);
  };
  const reach = Math.min(middle - stopBelow, stopAbove - middle, Math.PI) / 2;
  let best = middle;
  for (let i = -CENTRE_STEPS; i <= CENTRE_STEPS; i++) {
    const centre = middle + (reach * i) / CENTRE_STEPS;
    if (selectivity(centre) < selectivity(best) * (1 - 1e-12)) best = centre;
  }
  if (best === middle) return middle;
  let low = best - reach / CENTRE_STEPS;
  let high = best + reach / CENTRE_STEPS;
  for (let i = 0; i < CENTRE_REFINEMENTS; i++) {
    const a = low + 0.382 * (high - low);
    const b = high - 0.382 * (high - low);
    if (selectivity(a) <= selectivity(b)) high = b;
    else low = a;
  }
  const refined = (low + high) / 2;
  return selectivity(refined) < selectivity(best) ? refined : best;
}
