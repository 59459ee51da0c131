/** Ring-loaded interferometers as circuit parameters: how they are put together and what is refused of them. */
import type { InterferometerParameters, RingParameters } from '../circuit/index.ts';
import { Refusal } from '../errors.ts';

/** An interferometer with 0.5 couplers, the given rings and the arm phase on arm 1. */
export function balancedInterferometer(
  arms: readonly [readonly RingParameters[], readonly RingParameters[]],
  armPhaseRad: number,
): InterferometerParameters {
  return {
    inputCoupling: 0.5,
    outputCoupling: 0.5,
    arms: [
      { rings: arms[0], delay: 0, phaseRad: 0, lossDb: 0 },
      { rings: arms[1], delay: 0, phaseRad: armPhaseRad, lossDb: 0 },
    ],
    couplerExcessLossDb: 0,
  };
}

export interface CellLosses {
  /** Round-trip loss of every ring, dB (power). */
  readonly ringLossDb: number;
  readonly couplerExcessLossDb: number;
}

/** The same cell with losses put in. */
export function withLosses(cell: InterferometerParameters, losses: CellLosses): InterferometerParameters {
  const lossy = (rings: readonly RingParameters[]): RingParameters[] =>
    rings.map((ring) => ({ ...ring, lossDb: losses.ringLossDb * ring.delay }));
  return {
    ...cell,
    couplerExcessLossDb: losses.couplerExcessLossDb,
    arms: [
      { ...cell.arms[0], rings: lossy(cell.arms[0].rings) },
      { ...cell.arms[1], rings: lossy(cell.arms[1].rings) },
    ],
  };
}

/**
 * Throws a Refusal where a ring is critically or under-coupled, K ≤ 1 − (g·a)²: it no longer turns the phase by a whole
 * turn, so it is no all-pass and nothing built on arms of rings holds. g and a: coupler and round-trip amplitude.
 */
export function refuseUndercoupled(cells: readonly InterferometerParameters[]): void {
  cells.forEach((cell, index) => {
    const rings = cell.arms.flatMap((arm) => arm.rings);
    rings.forEach((ring, k) => {
      const least = -Math.expm1((-Math.LN10 / 10) * (ring.lossDb + cell.couplerExcessLossDb));
      if (ring.powerCrossCoupling > least) return;
      throw new Refusal({
        code: 'SPECIFICATION_UNREACHABLE',
        limit: 'COUPLING_RANGE',
        detail: `Ring ${k + 1} of cell ${index + 1} is undercoupled: at its round-trip loss K must exceed ${least.toPrecision(3)} for an all-pass.`,
        given: ring.powerCrossCoupling,
        allowed: { above: least },
      });
    });
  });
}
