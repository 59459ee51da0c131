/**
 * What a cascade's insertion loss is, against how far its stopband may begin: near the filter's own stop edge a cliff, not
 * a law. Every point starts from all pairings and from the solution of the edge before, which stays within the next
 * one's demands, so that the least loss never rises with the edge.
 */
import type { OutputPort, TransferFunction } from '../filter/index.ts';
import type { CascadeOptions } from './cascade-options.ts';
import type { OmegaMask } from './mask-problem.ts';
import { type OptimisedCascade, optimiseCascade } from './optimise-cascade.ts';

/** A single passband around a centre, ripple and rejection against its peak. */
export interface PassbandAsk {
  readonly centreRad: number;
  /** Half the passband's width, in (0, π). */
  readonly passEdgeRad: number;
  readonly rippleDb: number;
  readonly rejectionDb: number;
}

export interface TradeOffPoint {
  /** Distance of the stopband's edges from the centre. */
  readonly stopEdgeRad: number;
  /** Null where no cascade found keeps the demands. */
  readonly insertionLossDb: number | null;
  readonly cascade: OptimisedCascade;
}

/** The mask of an ask with its stopband beginning at `stopEdgeRad` on both sides of the centre. */
export function passbandMask(ask: PassbandAsk, stopEdgeRad: number): OmegaMask {
  const { centreRad, passEdgeRad, rippleDb, rejectionDb } = ask;
  return {
    reference: 'PEAK',
    bands: [
      { lowRad: centreRad - passEdgeRad, highRad: centreRad + passEdgeRad, minTransmissionDb: -rippleDb },
      {
        lowRad: centreRad + stopEdgeRad,
        highRad: centreRad + 2 * Math.PI - stopEdgeRad,
        maxTransmissionDb: -rejectionDb,
      },
    ],
  };
}

/**
 * The loss at each stop edge, in ascending order of edge; `maskAt` gives the mask of an edge. One optimisation a point
 * towards the same goal (the least loss where none is given), the first started from `startingCells` too. Progress over
 * all points; throws as `optimiseCascade` does.
 */
export function cascadeTradeOff(
  filter: TransferFunction,
  outputs: readonly OutputPort[],
  maskAt: (stopEdgeRad: number) => OmegaMask,
  stopEdgesRad: readonly number[],
  options: Partial<CascadeOptions> = {},
): TradeOffPoint[] {
  const edges = [...stopEdgesRad].sort((a, b) => a - b);
  const points: TradeOffPoint[] = [];
  let before = options.startingCells ?? [];
  edges.forEach((stopEdgeRad, index) => {
    const { onProgress } = options;
    const cascade = optimiseCascade(filter, outputs, maskAt(stopEdgeRad), {
      ...options,
      startingCells: before,
      ...(onProgress ? { onProgress: (share: number) => onProgress((index + share) / edges.length) } : {}),
    });
    points.push({ stopEdgeRad, insertionLossDb: cascade.met ? cascade.insertionLossDb : null, cascade });
    before = cascade.met ? [cascade.cells.map((cell) => cell.interferometer)] : before;
  });
  return points;
}
