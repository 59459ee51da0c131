/**
 * Two arms of an ideal interferometer onto two arms of a chip: which plain delays, how many rings, which ring where, what
 * becomes of the rings left over.
 *
 * A ring with K = 1 is −z⁻¹·e^(−jφ): an ideal one (a pole at 0) is the plain delay of a chip's arm, and a spare one makes
 * good a plain delay that the other arm has too much of.
 */
import type { InterferometerParameters, RingParameters } from '../circuit/circuit.ts';
import type { Coupler } from './model.ts';
import type { RingPlan } from './placed.ts';
import { outOfReach, undercoupled } from './refusals.ts';
import type { Parked } from './setting.ts';

/** 1 − K of a ring whose pole is at 0: two rounding steps of a number near 1. */
const FULL_COUPLING_SLACK = 4e-16;

/** By how much a coupling may lie outside its coupler's reach and be set to its end: far below any fabrication error. */
export const REACH_SLACK = 1e-9;

/** Place for one ring on an arm of a cell, or of several cells in a row. */
export interface Slot {
  readonly cell: number;
  readonly ring: number;
  /** `cell1.ring2`. */
  readonly element: string;
  readonly coupler: Coupler;
}

/** An ideal arm: the rings that have a pole, everything else as delay and phase. */
export interface IdealArm {
  readonly rings: readonly RingParameters[];
  readonly delay: number;
  readonly phaseRad: number;
}

export type IdealArms = readonly [IdealArm, IdealArm];

/** Takes the rings with K = 1 out of an arm as plain delay: −z^(−delay)·e^(−jφ). */
function idealArm(arm: InterferometerParameters['arms'][0]): IdealArm {
  const full = arm.rings.filter((ring) => 1 - ring.powerCrossCoupling <= FULL_COUPLING_SLACK);
  return {
    rings: arm.rings.filter((ring) => !full.includes(ring)),
    delay: full.reduce((sum, ring) => sum + ring.delay, arm.delay),
    phaseRad: full.reduce((sum, ring) => sum + ring.phaseRad + Math.PI, arm.phaseRad),
  };
}

export function idealArms(ideal: InterferometerParameters): IdealArms {
  return [idealArm(ideal.arms[0]), idealArm(ideal.arms[1])];
}

/**
 * Rings with K = 1 that each arm needs so that the arms' delays differ as the ideal ones do; null where no whole number of
 * round trips does it.
 */
export function compensatingRings(
  idealDelay: readonly [number, number],
  armDelay: readonly [number, number],
  ringDelay: number,
): readonly [number, number] | null {
  const excess = (armDelay[0] - idealDelay[0] - (armDelay[1] - idealDelay[1])) / ringDelay;
  if (Math.abs(excess - Math.round(excess)) > REACH_SLACK) return null;
  return [Math.max(0, -Math.round(excess)), Math.max(0, Math.round(excess))];
}

const reaches = (coupler: Coupler, powerCrossCoupling: number): boolean =>
  powerCrossCoupling >= coupler.minCoupling - REACH_SLACK &&
  powerCrossCoupling <= coupler.maxCoupling + REACH_SLACK;

/** The coupling as the coupler can have it, or a refusal. */
export function withinReach(element: string, coupler: Coupler, powerCrossCoupling: number): number {
  if (!reaches(coupler, powerCrossCoupling)) throw outOfReach(element, powerCrossCoupling, coupler);
  return Math.min(coupler.maxCoupling, Math.max(coupler.minCoupling, powerCrossCoupling));
}

/**
 * Which slot each ring takes: bipartite matching by augmenting paths (H. W. Kuhn, Naval Research Logistics Quarterly 2,
 * 83 (1955)); slots that cannot decouple are tried first, so that they are used and not left over.
 */
function assignSlots(rings: readonly RingParameters[], slots: readonly Slot[]): Int32Array {
  const byLeak = slots
    .map((_, s) => s)
    .sort((a, b) => slots[b]!.coupler.minCoupling - slots[a]!.coupler.minCoupling);
  const ringAt = new Int32Array(slots.length).fill(-1);
  const settle = (ring: number, visited: Set<number>): boolean => {
    for (const s of byLeak) {
      if (visited.has(s) || !reaches(slots[s]!.coupler, rings[ring]!.powerCrossCoupling)) continue;
      visited.add(s);
      if (ringAt[s]! >= 0 && !settle(ringAt[s]!, visited)) continue;
      ringAt[s] = ring;
      return true;
    }
    return false;
  };
  rings.forEach((ring, index) => {
    if (settle(index, new Set())) return;
    const distance = (slot: Slot) =>
      Math.max(
        slot.coupler.minCoupling - ring.powerCrossCoupling,
        ring.powerCrossCoupling - slot.coupler.maxCoupling,
      );
    const nearest = [...slots].sort((a, b) => distance(a) - distance(b))[0]!;
    throw outOfReach(`${nearest.element}.coupling`, ring.powerCrossCoupling, nearest.coupler);
  });
  return ringAt;
}

export interface PlacedSlots {
  readonly plans: ReadonlyMap<Slot, RingPlan>;
  readonly parked: readonly Parked[];
  /** Σ K of parked rings that neither decouple nor cancel: 0 is clean. */
  readonly leak: number;
}

/**
 * Parks rings: decoupled where the coupler reaches 0; two that cannot, one on each arm, with equal K, so that they cancel
 * in both outputs; the rest at their least K, resonant at `parkAtRad`, where the response does not matter.
 */
export function parkRings(
  spare: readonly [readonly Slot[], readonly Slot[]],
  parkAtRad: number,
): PlacedSlots {
  const plans = new Map<Slot, RingPlan>();
  const parked: Parked[] = [];
  let leak = 0;
  const park = (slot: Slot, powerCrossCoupling: number, how: string) => {
    plans.set(slot, { powerCrossCoupling, phaseRad: -parkAtRad, parked: true });
    parked.push({ element: slot.element, how });
  };
  const waiting: [Slot[], Slot[]] = [[...spare[0]], [...spare[1]]];
  for (const arm of [0, 1] as const)
    for (const slot of waiting[arm].filter((candidate) => candidate.coupler.minCoupling > 0)) {
      if (plans.has(slot)) continue;
      const partner = waiting[1 - arm]!.filter((other) => !plans.has(other))
        .sort((a, b) => b.coupler.minCoupling - a.coupler.minCoupling)
        .find((other) => {
          const common = Math.max(slot.coupler.minCoupling, other.coupler.minCoupling);
          return reaches(slot.coupler, common) && reaches(other.coupler, common);
        });
      if (!partner) continue;
      const common = Math.max(slot.coupler.minCoupling, partner.coupler.minCoupling);
      const how = (other: Slot) =>
        `equal to ${other.element} on the other arm (K ${common}), so that the two cancel; detuned`;
      park(slot, common, how(partner));
      park(partner, common, how(slot));
    }
  for (const slot of [...waiting[0], ...waiting[1]]) {
    if (plans.has(slot)) continue;
    const least = slot.coupler.minCoupling;
    leak += least;
    if (least === 0) park(slot, 0, 'decoupled (K 0)');
    else
      park(
        slot,
        least,
        `detuned to ${parkAtRad.toFixed(4)} rad of the FSR at its least coupling (K ${least})`,
      );
  }
  return { plans, parked, leak };
}

/**
 * Rings onto the slots of two arms, `full` of them more at K = 1 on each arm, the rest parked. Refuses what no slot
 * reaches, and rings that the chip's loss undercouples (K ≤ 1 − what one turn leaves).
 */
export function placeRings(
  slots: readonly [readonly Slot[], readonly Slot[]],
  rings: readonly [readonly RingParameters[], readonly RingParameters[]],
  full: readonly [number, number],
  remaining: number,
  parkAtRad: number,
): PlacedSlots {
  const plans = new Map<Slot, RingPlan>();
  const spare: [Slot[], Slot[]] = [[], []];
  for (const arm of [0, 1] as const) {
    const straight = { powerCrossCoupling: 1, phaseRad: 0, lossDb: 0, delay: 1 };
    const wanted = [...rings[arm], ...Array.from({ length: full[arm] }, () => straight)];
    const ringAt = assignSlots(wanted, slots[arm]);
    slots[arm].forEach((slot, s) => {
      const ring = wanted[ringAt[s]!];
      if (!ring) {
        spare[arm].push(slot);
        return;
      }
      const path = `${slot.element}.coupling`;
      if (ring.powerCrossCoupling <= 1 - remaining)
        throw undercoupled(path, ring.powerCrossCoupling, 1 - remaining);
      const powerCrossCoupling = withinReach(path, slot.coupler, ring.powerCrossCoupling);
      plans.set(slot, { powerCrossCoupling, phaseRad: ring.phaseRad, parked: false });
    });
  }
  const left = parkRings(spare, parkAtRad);
  return { plans: new Map([...plans, ...left.plans]), parked: left.parked, leak: left.leak };
}
