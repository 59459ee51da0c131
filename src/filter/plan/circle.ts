/** Intervals on the circle of one FSR. The response repeats every FSR, so this is where bands meet. */
import type { IntervalGhz } from '../specification.ts';

const TURN = 2 * Math.PI;

/** From `startRad` (any real) over `lengthRad` in [0, 2π]; a line has length 0. */
export interface Arc {
  readonly startRad: number;
  readonly lengthRad: number;
}

export function arcOf(interval: IntervalGhz, fsrGhz: number): Arc {
  return {
    startRad: (TURN * interval.lowGhz) / fsrGhz,
    lengthRad: Math.min(TURN, (TURN * (interval.highGhz - interval.lowGhz)) / fsrGhz),
  };
}

/** The angle in [0, 2π) that falls on the same point of the FSR. */
export function foldRad(angleRad: number): number {
  const folded = angleRad % TURN;
  return folded < 0 ? folded + TURN : folded;
}

/** The offset within ±FSR/2 that falls on the same point of the FSR. */
export function foldGhz(offsetGhz: number, fsrGhz: number): number {
  return offsetGhz - fsrGhz * Math.round(offsetGhz / fsrGhz);
}

/** A point that both arcs hold, as an angle, or null. Arcs that only touch do not meet unless one of them is a line. */
export function commonPoint(a: Arc, b: Arc): number | null {
  const tolerance = 1e-12 * TURN;
  for (const [first, second] of [
    [a, b],
    [b, a],
  ] as const) {
    const ahead = foldRad(second.startRad - first.startRad);
    const within = ahead < first.lengthRad - tolerance;
    const onLine = second.lengthRad === 0 && (ahead <= first.lengthRad || TURN - ahead <= tolerance);
    if (within || onLine || (first.lengthRad === 0 && (ahead <= tolerance || TURN - ahead <= tolerance))) {
      return second.startRad;
    }
  }
  return null;
}

/** Least distance on the circle, in [0, π], from `pointRad` to the arc. */
export function distanceRad(pointRad: number, arc: Arc): number {
  const ahead = foldRad(pointRad - arc.startRad);
  if (ahead <= arc.lengthRad) return 0;
  return Math.min(TURN - ahead, ahead - arc.lengthRad);
}

/** A single line gets this share of the room around it as its half-width: it then lies inside a band, not on an edge. */
export const LINE_SHARE = 1e-3;

/** A stopband edge kept off the point half an FSR away, where a design edge would be infinite in the s-plane. */
export function insideHalfTurn(stopEdgeRad: number, passEdgeRad: number): number {
  return Math.min(stopEdgeRad, Math.PI - LINE_SHARE * (Math.PI - passEdgeRad));
}
