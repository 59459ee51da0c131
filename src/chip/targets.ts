/**
 * Which heater phases a placed circuit asks for. The phases a, b, c that tunable couplers add are taken back here, the
 * reverse of `fold.ts`, and what light does not notice is not asked for:
 * - the phase of a ring with K = 0, and everything on an arm without light;
 * - between two mixing couplers only the *sum* of all phases on arm 1 less those on arm 0 counts: arms of cells joined by
 *   plain guides, and rings with K = 1, which are plain delays. One heater sets the sum, the others stay off.
 *
 * Every wanted phase is a constant plus a part from each coupler that depends on which of ±θ the coupler takes.
 */
import type { InterferometerParameters } from '../circuit/circuit.ts';
import { Refusal } from '../errors.ts';
import { REACH_SLACK } from './arms.ts';
import { type CouplerState, couplerAt, thetaForCoupling } from './coupler.ts';
import { type ChipElement, couplerOf, listElements } from './elements.ts';
import type { ChipModel, Coupler } from './model.ts';
import type { PlacedCircuit } from './placed.ts';

/** K below which a coupler is two guides (field 1e-10), and 1 − K below which it crosses them: rounding of K itself. */
const NO_COUPLING = 1e-20;
const FULL_COUPLING_SLACK = 4e-16;

/** By how much an element without a heater may miss its value: far below what fabrication leaves. */
export const UNDRIVEN_SLACK = 1e-6;

/** A coupler's contribution to a phase, rad, on its branches +θ and −θ. */
interface Part {
  readonly coupler: number;
  readonly plusRad: number;
  readonly minusRad: number;
}

/** Σ weight · phase(channel) = constantRad + parts, up to whole turns. */
export interface PhaseDemand {
  readonly path: string;
  /** The channel that is set to meet it; null: no heater does, the phases as they rest must meet it. */
  readonly channel: number | null;
  readonly terms: readonly { readonly channel: number; readonly weight: number }[];
  readonly constantRad: number;
  readonly parts: readonly Part[];
}

export interface ThermalTargets {
  readonly demands: readonly PhaseDemand[];
  /** Couplers that have two branches; `Part.coupler` counts these. */
  readonly branches: number;
  /** Paths that the circuit relies on and no channel drives. */
  readonly undriven: readonly string[];
  /** Rings (`cell1.ring2`) that light reaches and that are not decoupled. */
  readonly coupledRings: readonly string[];
}

interface PlacedCoupler {
  readonly element: ChipElement;
  /** −1: both branches are one. */
  readonly branch: number;
  readonly thetaRad: readonly [number, number];
  readonly states: readonly [CouplerState, CouplerState];
  readonly powerCrossCoupling: number;
}

interface Segment {
  readonly constantRad: number;
  readonly parts: readonly Part[];
  readonly terms: readonly { readonly channel: number; readonly weight: number; readonly arm: boolean }[];
  readonly path: string;
}

type Phase = keyof Omit<CouplerState, 'powerCrossCoupling'>;

/** weight · (sum of the named phases) of a coupler, with the sign of being *taken back* left to the caller. */
function partOf(coupler: PlacedCoupler, weight: number, phases: readonly Phase[]): Segment['parts'][number] {
  const sum = (state: CouplerState) => weight * phases.reduce((total, phase) => total + state[phase], 0);
  return { coupler: coupler.branch, plusRad: sum(coupler.states[0]), minusRad: sum(coupler.states[1]) };
}

function refuseUndriven(path: string, given: number, rests: number): never {
  throw new Refusal({
    code: 'SETTING_UNREACHABLE',
    detail: `${path} would have to be ${given.toPrecision(6)}; no channel drives it, and it rests at ${rests.toPrecision(6)}.`,
    element: path,
    given,
    allowed: rests,
  });
}

/** A circuit that was changed after it was placed may have left a coupler's reach. */
function refuseBeyondReach(path: string, coupler: Coupler, powerCrossCoupling: number): void {
  const { minCoupling: min, maxCoupling: max } = coupler;
  if (powerCrossCoupling >= min - REACH_SLACK && powerCrossCoupling <= max + REACH_SLACK) return;
  throw new Refusal({
    code: 'SETTING_UNREACHABLE',
    limit: 'COUPLING_RANGE',
    detail: `${path} would have to be ${powerCrossCoupling.toPrecision(6)}; it reaches ${min} to ${max}.`,
    element: path,
    given: powerCrossCoupling,
    allowed: { min, max },
  });
}

/** Where the walk along the light stands. */
interface Walk {
  readonly chip: ChipModel;
  readonly elements: ReadonlyMap<string, ChipElement>;
  readonly demands: PhaseDemand[];
  readonly undriven: string[];
  readonly coupledRings: string[];
  branches: number;
  /** Which of the two guides carry light. */
  lit: readonly [boolean, boolean];
  /** Since the last mixing coupler; null before the first. */
  segment: Segment | null;
}

function placeCoupler(walk: Walk, cell: number, name: string, powerCrossCoupling: number): PlacedCoupler {
  const path = `${walk.chip.cells[cell]!.name}.${name}.coupling`;
  const element = walk.elements.get(path)!;
  const coupler = couplerOf(walk.chip.cells[cell]!, name);
  if (!coupler.tunable || element.channel === null) {
    const state = couplerAt(coupler, 0);
    if (Math.abs(state.powerCrossCoupling - powerCrossCoupling) > UNDRIVEN_SLACK)
      refuseUndriven(path, powerCrossCoupling, state.powerCrossCoupling);
    if (coupler.tunable) walk.undriven.push(path);
    return { element, branch: -1, thetaRad: [0, 0], states: [state, state], powerCrossCoupling };
  }
  refuseBeyondReach(path, coupler, powerCrossCoupling);
  const thetaRad = thetaForCoupling(coupler, powerCrossCoupling);
  const single = thetaRad[0] === 0 || thetaRad[0] === Math.PI;
  const branch = single ? -1 : walk.branches++;
  const states = [
    couplerAt(coupler, thetaRad[0]),
    couplerAt(coupler, single ? thetaRad[0] : thetaRad[1]),
  ] as const;
  walk.demands.push({
    path,
    channel: element.channel,
    terms: [{ channel: element.channel, weight: 1 }],
    constantRad: 0,
    parts: [{ coupler: branch, plusRad: thetaRad[0], minusRad: single ? thetaRad[0] : thetaRad[1] }],
  });
  return { element, branch, thetaRad, states, powerCrossCoupling };
}

function extend(walk: Walk, change: Partial<Segment>): void {
  if (!walk.segment) return;
  walk.segment = {
    constantRad: walk.segment.constantRad + (change.constantRad ?? 0),
    parts: [...walk.segment.parts, ...(change.parts ?? [])],
    terms: [...walk.segment.terms, ...(change.terms ?? [])],
    path: change.path ?? walk.segment.path,
  };
}

function closeSegment(walk: Walk): void {
  const { segment } = walk;
  if (!segment || !walk.lit[0] || !walk.lit[1]) return;
  const driver = segment.terms.findLast((term) => term.arm) ?? segment.terms.at(-1);
  const sign = driver?.weight ?? 1;
  if (!driver) walk.undriven.push(segment.path);
  walk.demands.push({
    path: segment.path,
    channel: driver?.channel ?? null,
    terms: segment.terms.map(({ channel, weight }) => ({ channel, weight: weight * sign })),
    constantRad: segment.constantRad * sign,
    parts: segment.parts.map(({ coupler, plusRad, minusRad }) => ({
      coupler,
      plusRad: plusRad * sign,
      minusRad: minusRad * sign,
    })),
  });
}

function passCoupler(walk: Walk, cell: number, name: 'input' | 'output', powerCrossCoupling: number): void {
  const coupler = placeCoupler(walk, cell, name, powerCrossCoupling);
  if (powerCrossCoupling <= NO_COUPLING) {
    // Guide 2 gains b, guide 1 gains a + c: arm 1 has to be set to −(b − a − c) of it.
    extend(walk, {
      parts: [partOf(coupler, -1, ['outPhase2Rad']), partOf(coupler, 1, ['outPhase1Rad', 'inPhase1Rad'])],
    });
    return;
  }
  extend(walk, { parts: [partOf(coupler, 1, ['inPhase1Rad'])] });
  closeSegment(walk);
  const crossed = 1 - powerCrossCoupling <= FULL_COUPLING_SLACK;
  walk.lit = crossed ? [walk.lit[1], walk.lit[0]] : [true, true];
  walk.segment = {
    constantRad: 0,
    parts: [partOf(coupler, -1, ['outPhase2Rad']), partOf(coupler, 1, ['outPhase1Rad'])],
    terms: [],
    path: coupler.element.path,
  };
}

function passRing(
  walk: Walk,
  cell: number,
  ring: number,
  arm: 0 | 1,
  powerCrossCoupling: number,
  phaseRad: number,
): void {
  const name = `ring${ring + 1}`;
  const coupler = placeCoupler(walk, cell, name, powerCrossCoupling);
  const sign = arm === 1 ? 1 : -1;
  extend(walk, { parts: [partOf(coupler, -sign, ['outPhase1Rad', 'inPhase1Rad'])] });
  if (powerCrossCoupling <= NO_COUPLING) return;
  walk.coupledRings.push(`${walk.chip.cells[cell]!.name}.${name}`);
  const path = `${walk.chip.cells[cell]!.name}.${name}.phase`;
  const { channel } = walk.elements.get(path)!;
  if (1 - powerCrossCoupling <= FULL_COUPLING_SLACK) {
    extend(walk, {
      constantRad: sign * phaseRad,
      parts: [partOf(coupler, -sign, ['outPhase2Rad'])],
      terms: channel === null ? [] : [{ channel, weight: sign, arm: false }],
    });
    return;
  }
  if (channel === null) walk.undriven.push(path);
  walk.demands.push({
    path,
    channel,
    terms: channel === null ? [] : [{ channel, weight: 1 }],
    constantRad: phaseRad,
    parts: [partOf(coupler, -1, ['outPhase2Rad'])],
  });
}

function passArms(walk: Walk, cell: number, parameters: InterferometerParameters): void {
  let ring = 0;
  for (const arm of [0, 1] as const)
    for (const { powerCrossCoupling, phaseRad } of parameters.arms[arm].rings) {
      if (walk.lit[arm]) passRing(walk, cell, ring, arm, powerCrossCoupling, phaseRad);
      ring++;
    }
  const path = `${walk.chip.cells[cell]!.name}.arm.phase`;
  const { channel } = walk.elements.get(path)!;
  extend(walk, {
    constantRad: parameters.arms[1].phaseRad - parameters.arms[0].phaseRad,
    terms: channel === null ? [] : [{ channel, weight: 1, arm: true }],
    path,
  });
}

/** Cells that share their guides, from in1 of the first to the outputs of the last. */
function passCells(walk: Walk, placed: PlacedCircuit, cells: readonly number[]): void {
  walk.lit = [true, false];
  walk.segment = null;
  for (const cell of cells) {
    const parameters = placed.circuit.cells[cell]!;
    passCoupler(walk, cell, 'input', parameters.inputCoupling);
    passArms(walk, cell, parameters);
    passCoupler(walk, cell, 'output', parameters.outputCoupling);
  }
}

/** Throws a Refusal for a coupling that no channel drives and that does not rest where it has to be. Cost O(elements). */
export function thermalTargets(placed: PlacedCircuit, chip: ChipModel): ThermalTargets {
  const walk: Walk = {
    chip,
    elements: new Map(listElements(chip).map((element) => [element.path, element])),
    demands: [],
    undriven: [],
    coupledRings: [],
    branches: 0,
    lit: [true, false],
    segment: null,
  };
  const all = chip.cells.map((_, index) => index);
  if (chip.join === 'BOTH') passCells(walk, placed, all);
  else for (const cell of all) passCells(walk, placed, [cell]);
  const { demands, branches, undriven, coupledRings } = walk;
  return { demands, branches, undriven, coupledRings };
}

/** The phase a demand asks for on the given branches (0: +θ, 1: −θ), rad. */
export function wantedPhase(demand: PhaseDemand, branches: Uint8Array): number {
  let wanted = demand.constantRad;
  for (const part of demand.parts)
    wanted += part.coupler >= 0 && branches[part.coupler] === 1 ? part.minusRad : part.plusRad;
  return wanted;
}
