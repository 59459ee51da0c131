/**
 * A mask over Ω as a constrained minimax problem in the parameters of a cascade, in dB throughout.
 *
 * Demands relative to the peak need the peak twice. Where more light at the peak helps (stopbands, least loss) the
 * transmission at the brightest point of the passband stands for it: a true peak elsewhere only helps more. Where it
 * hurts (ripple) an extra unknown, the level, bounds all passband points from above and their demand hangs from it; so
 * every function is smooth and no step is spoilt by the peak jumping to another point.
 */

import type { TransmissionReference } from '../filter/index.ts';
import type { MinimaxProblem } from '../optimise/index.ts';
import type { CascadeModel } from './cascade-model.ts';

/** An interval of Ω (may pass ±π) with what is asked there. */
export interface OmegaBand {
  readonly lowRad: number;
  readonly highRad: number;
  /** Passband: least transmission, dB ≤ 0. */
  readonly minTransmissionDb?: number;
  /** Stopband: greatest transmission, dB ≤ 0. */
  readonly maxTransmissionDb?: number;
}

export interface OmegaMask {
  readonly bands: readonly OmegaBand[];
  readonly reference: TransmissionReference;
}

/**
 * LEAST_LOSS: most light at the peak with every demand kept. DEEPEST_STOPBAND: most margin in the stopbands with the
 * passband's demands (and the greatest insertion loss, where given) kept. GREATEST_MARGIN: the worst margin of all.
 */
export type CascadeGoal = 'LEAST_LOSS' | 'DEEPEST_STOPBAND' | 'GREATEST_MARGIN';

/** Points of a band: by the order of the cascade, so that no ripple falls between them. */
const POINTS_PER_BAND = 24;
const POINTS_PER_POLE = 16;

/** The level moves by decibels where angles move by tenths of a radian. */
const LEVEL_WEIGHT = 1e-4;

interface Demand {
  readonly point: number;
  /** +1: transmission ≤ limit, −1: transmission ≥ limit. */
  readonly sense: 1 | -1;
  readonly limitDb: number;
}

export interface MaskGrid {
  readonly omegaRad: Float64Array;
  readonly passPoints: readonly number[];
  readonly demands: readonly Demand[];
}

/** Points of every band, crowded towards its edges as the zeros of a Chebyshev polynomial are, edges included. */
export function maskGrid(mask: OmegaMask, order: number, density: number): MaskGrid {
  const omega: number[] = [];
  const passPoints: number[] = [];
  const demands: Demand[] = [];
  const count = Math.ceil(density * (POINTS_PER_BAND + POINTS_PER_POLE * order));
  for (const band of mask.bands) {
    for (let k = 0; k < count; k++) {
      const point = omega.length;
      const across = Math.cos((Math.PI * k) / (count - 1));
      omega.push((band.lowRad + band.highRad) / 2 - ((band.highRad - band.lowRad) / 2) * across);
      if (band.minTransmissionDb !== undefined) {
        passPoints.push(point);
        demands.push({ point, sense: -1, limitDb: band.minTransmissionDb });
      }
      if (band.maxTransmissionDb !== undefined)
        demands.push({ point, sense: 1, limitDb: band.maxTransmissionDb });
    }
  }
  return { omegaRad: Float64Array.from(omega), passPoints, demands };
}

/** The brightest of the passband's points. */
export function brightest(grid: MaskGrid, powerDb: Float64Array): number {
  let best = grid.passPoints[0]!;
  for (const point of grid.passPoints) if (powerDb[point]! > powerDb[best]!) best = point;
  return best;
}

/** dB by which the worst demand is missed (negative: margin), by the true peak of these points. */
export function worstMiss(grid: MaskGrid, mask: OmegaMask, powerDb: Float64Array, sense?: 1 | -1): number {
  const peakDb = mask.reference === 'PEAK' ? powerDb[brightest(grid, powerDb)]! : 0;
  let worst = Number.NEGATIVE_INFINITY;
  for (const demand of grid.demands)
    if (sense === undefined || demand.sense === sense)
      worst = Math.max(worst, demand.sense * (powerDb[demand.point]! - peakDb - demand.limitDb));
  return worst;
}

/** One function of the problem: constant + at·T[point] + atPeak·T[peak] + atLevel·level. */
interface Term {
  readonly constant: number;
  readonly point: number;
  readonly at: number;
  readonly atPeak: number;
  readonly atLevel: number;
}

function termsOf(
  grid: MaskGrid,
  mask: OmegaMask,
  goal: CascadeGoal,
  greatestLossDb: number | undefined,
): { objectives: Term[]; constraints: Term[] } {
  const relative = mask.reference === 'PEAK' ? 1 : 0;
  const term = ({ point, sense, limitDb }: Demand): Term => ({
    constant: -sense * limitDb,
    point,
    at: sense,
    atPeak: sense > 0 ? -relative : 0,
    atLevel: sense < 0 ? relative : 0,
  });
  const stop = grid.demands.filter(({ sense }) => sense > 0).map(term);
  const pass = grid.demands.filter(({ sense }) => sense < 0).map(term);
  const levelled: Term[] = relative
    ? grid.passPoints.map((point) => ({ constant: 0, point, at: 1, atPeak: 0, atLevel: -1 }))
    : [];
  const peak = { constant: 0, point: 0, at: 0, atPeak: -1, atLevel: 0 };
  const lossLimit = greatestLossDb === undefined ? [] : [{ ...peak, constant: -greatestLossDb }];
  if (goal === 'LEAST_LOSS')
    return { objectives: [peak], constraints: [...stop, ...pass, ...levelled, ...lossLimit] };
  if (goal === 'DEEPEST_STOPBAND')
    return { objectives: stop, constraints: [...pass, ...levelled, ...lossLimit] };
  return { objectives: [...stop, ...pass], constraints: [...levelled, ...lossLimit] };
}

export interface CascadeProblem extends MinimaxProblem {
  /** Parameters with the level behind them, as the problem's unknowns. */
  readonly startOf: (parameters: Float64Array) => Float64Array;
  readonly parametersOf: (unknowns: Float64Array) => Float64Array;
}

/** The problem of `model` on `grid`. `limits`: lowest and highest value of each parameter. */
export function maskProblem(
  model: CascadeModel,
  grid: MaskGrid,
  mask: OmegaMask,
  goal: CascadeGoal,
  greatestLossDb: number | undefined,
  limits: { readonly lower: Float64Array; readonly upper: Float64Array },
): CascadeProblem {
  const { objectives, constraints } = termsOf(grid, mask, goal, greatestLossDb);
  const terms = [...objectives, ...constraints];
  const width = model.parameters;
  const unknowns = width + 1;
  const powerDb = new Float64Array(model.points);
  const slopes = new Float64Array(model.points * width);
  const withLevel = (values: Float64Array, level: number): Float64Array => Float64Array.of(...values, level);
  const evaluateInto: MinimaxProblem['evaluateInto'] = (x, values, jacobian) => {
    model.evaluateInto(x, powerDb, jacobian === null ? null : slopes);
    const peak = brightest(grid, powerDb);
    const level = x[width]!;
    for (let row = 0; row < terms.length; row++) {
      const { constant, point, at, atPeak, atLevel } = terms[row]!;
      values[row] = constant + at * powerDb[point]! + atPeak * powerDb[peak]! + atLevel * level;
      if (jacobian === null) continue;
      for (let k = 0; k < width; k++)
        jacobian[row * unknowns + k] = at * slopes[point * width + k]! + atPeak * slopes[peak * width + k]!;
      jacobian[row * unknowns + width] = atLevel;
    }
  };
  return {
    unknowns,
    objectives: objectives.length,
    constraints: constraints.length,
    evaluateInto,
    lower: withLevel(limits.lower, Number.NEGATIVE_INFINITY),
    upper: withLevel(limits.upper, Number.POSITIVE_INFINITY),
    weights: withLevel(new Float64Array(width).fill(1), LEVEL_WEIGHT),
    startOf: (parameters) => {
      model.evaluateInto(parameters, powerDb, null);
      return withLevel(parameters, powerDb[brightest(grid, powerDb)]!);
    },
    parametersOf: (x) => x.slice(0, width),
  };
}
