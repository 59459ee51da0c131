/** Cells that a design does not use: light goes through them as if they were a guide, as nearly as their couplers allow. */
import type { OutputPort } from '../filter/specification.ts';
import { parkRings, REACH_SLACK, type Slot, withinReach } from './arms.ts';
import { LARGEST_OFF_BALANCE } from './balance.ts';
import { couplerOf, ringCount } from './elements.ts';
import type { ChipModel, Coupler } from './model.ts';
import type { CellPlan, RingPlan } from './placed.ts';
import { outOfReach } from './refusals.ts';
import { type PlannedCells, slotsOf } from './run.ts';
import type { Parked } from './setting.ts';

/**
 * Σ of couplings off their route beyond which a cell does not count as passed through (0.2 dB a coupler). Two equal fields
 * are less particular: there a miss of both couplers by `LARGEST_OFF_BALANCE` loses 0.8 dB.
 */
const LARGEST_LEAK = 0.1;

interface Route {
  readonly inputCoupling: number;
  readonly outputCoupling: number;
  /** The arm that carries the light; null: both, as a balanced interferometer. */
  readonly arm: 0 | 1 | null;
  readonly armPhaseRad: number;
}

const clamp = (coupler: Coupler, value: number): number =>
  Math.min(coupler.maxCoupling, Math.max(coupler.minCoupling, value));

/**
 * Through both arms with equal fields: to OUT2 with K_out = 1−K_in, to OUT1 with K_out = K_in and arm phase π. The only way
 * with fixed couplers of 0.5. Null where the arms' delays differ.
 */
function balancedRoute(chip: ChipModel, index: number, port: OutputPort): Route | null {
  const cell = chip.cells[index]!;
  if (Math.abs(cell.armDelay[0] - cell.armDelay[1]) > REACH_SLACK) return null;
  const [input, output] = [couplerOf(cell, 'input'), couplerOf(cell, 'output')];
  const mirrored = port === 'OUT2';
  const low = Math.max(input.minCoupling, mirrored ? 1 - output.maxCoupling : output.minCoupling);
  const high = Math.min(input.maxCoupling, mirrored ? 1 - output.minCoupling : output.maxCoupling);
  // Reaches that do not meet share what is missing: each coupler stays at its end, as near to the other as it comes.
  const inputCoupling = low > high ? (low + high) / 2 : Math.min(high, Math.max(low, 0.5));
  return {
    inputCoupling,
    outputCoupling: mirrored ? 1 - inputCoupling : inputCoupling,
    arm: null,
    armPhaseRad: mirrored ? 0 : Math.PI,
  };
}

function routesTo(chip: ChipModel, index: number, port: OutputPort): Route[] {
  const across = port === 'OUT2';
  const balanced = balancedRoute(chip, index, port);
  return [
    { inputCoupling: 0, outputCoupling: across ? 1 : 0, arm: 0, armPhaseRad: 0 },
    { inputCoupling: 1, outputCoupling: across ? 0 : 1, arm: 1, armPhaseRad: 0 },
    ...(balanced ? [balanced] : []),
  ];
}

function darkRings(slots: readonly Slot[]): { plans: [Slot, RingPlan][]; parked: Parked[] } {
  return {
    plans: slots.map((slot) => [
      slot,
      { powerCrossCoupling: slot.coupler.minCoupling, phaseRad: 0, parked: true },
    ]),
    parked: slots.map(({ element }) => ({ element, how: 'on an arm without light; not heated' })),
  };
}

function planRoute(
  chip: ChipModel,
  index: number,
  route: Route,
  carries: CellPlan['carries'],
  parkAtRad: number,
): PlannedCells {
  const cell = chip.cells[index]!;
  const inputCoupling = clamp(couplerOf(cell, 'input'), route.inputCoupling);
  const outputCoupling = clamp(couplerOf(cell, 'output'), route.outputCoupling);
  const offRoute =
    Math.abs(inputCoupling - route.inputCoupling) + Math.abs(outputCoupling - route.outputCoupling);
  const [upper, lower] = slotsOf(chip, { first: index, last: index });
  const dark = offRoute > 0 || route.arm === null ? [] : route.arm === 0 ? lower : upper;
  const lit = (slots: readonly Slot[]) => (slots === dark ? [] : slots);
  const rings =
    route.arm === null
      ? parkRings([upper, lower], parkAtRad)
      : parkRings([[...lit(upper), ...lit(lower)], []], parkAtRad);
  const unlit = darkRings(dark);
  const plans = new Map([...rings.plans, ...unlit.plans]);
  const way = route.arm === null ? 'both arms' : route.arm === 0 ? 'arm 0' : 'arm 1';
  const goesTo = (['OUT1', 'OUT2'] as const).filter((port) => carries[port] === 'PASSED_ON');
  const how = `passed through to ${goesTo.join(' and ')} by ${way} (input K ${inputCoupling}, output K ${outputCoupling})`;
  const plan: CellPlan = {
    section: null,
    inputCoupling,
    outputCoupling,
    armPhaseRad: route.armPhaseRad,
    rings: [...upper, ...lower].sort((a, b) => a.ring - b.ring).map((slot) => plans.get(slot)!),
    carries,
    parked: [{ element: cell.name, how }, ...rings.parked, ...unlit.parked],
  };
  const couplersOff = route.arm === null && offRoute > REACH_SLACK ? offRoute : 0;
  const offBalance = { first: index, last: index, wanted: route, port: goesTo[0]!, passes: true };
  return {
    plans: [couplersOff > 0 ? { ...plan, offBalance } : plan],
    leak: offRoute + rings.leak,
    delayRings: 0,
    couplersOff,
    nullField: 0,
  };
}

/** An unused cell set to pass the light of in1 to `port`, by its cleanest route; refused where none comes near. */
export function planPassThrough(
  chip: ChipModel,
  index: number,
  port: OutputPort,
  parkAtRad: number,
): PlannedCells {
  const carries = { OUT1: 'NOTHING', OUT2: 'NOTHING', [port]: 'PASSED_ON' } as CellPlan['carries'];
  const passable = routesTo(chip, index, port)
    .map((route) => planRoute(chip, index, route, carries, parkAtRad))
    .filter(
      ({ leak, couplersOff }) =>
        couplersOff <= 2 * LARGEST_OFF_BALANCE + REACH_SLACK && leak - couplersOff <= LARGEST_LEAK,
    );
  if (passable.length > 0) return passable.reduce((a, b) => (b.leak < a.leak - REACH_SLACK ? b : a));
  const cell = chip.cells[index]!;
  const output = couplerOf(cell, 'output');
  const wanted = port === 'OUT2' ? 1 : 0;
  const off = clamp(output, wanted) === wanted ? 'input' : 'output';
  throw outOfReach(`${cell.name}.${off}.coupling`, off === 'output' ? wanted : 0, couplerOf(cell, off));
}

/** An unused cell whose two guides both go on: its couplers must decouple. `lit`: guides that carry light. */
export function planTwoGuides(
  chip: ChipModel,
  index: number,
  lit: 'FIRST' | 'BOTH',
  parkAtRad: number,
): PlannedCells {
  const cell = chip.cells[index]!;
  for (const element of ['input', 'output'])
    withinReach(`${cell.name}.${element}.coupling`, couplerOf(cell, element), 0);
  const carries: CellPlan['carries'] = { OUT1: 'PASSED_ON', OUT2: lit === 'BOTH' ? 'PASSED_ON' : 'NOTHING' };
  const route: Route = { inputCoupling: 0, outputCoupling: 0, arm: 0, armPhaseRad: 0 };
  if (lit === 'FIRST' || ringCount(cell) === 0) return planRoute(chip, index, route, carries, parkAtRad);
  const [upper, lower] = slotsOf(chip, { first: index, last: index });
  const rings = parkRings([[...upper, ...lower], []], parkAtRad);
  const plan: CellPlan = {
    section: null,
    inputCoupling: 0,
    outputCoupling: 0,
    armPhaseRad: 0,
    rings: [...upper, ...lower].sort((a, b) => a.ring - b.ring).map((slot) => rings.plans.get(slot)!),
    carries,
    parked: [{ element: cell.name, how: 'both guides passed on (input and output K 0)' }, ...rings.parked],
  };
  return { plans: [plan], leak: rings.leak, delayRings: 0, couplersOff: 0, nullField: 0 };
}
