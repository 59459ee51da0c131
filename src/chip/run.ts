/** An ideal interferometer onto one cell, or onto several cells in a row that both guides join into one. */
import type { InterferometerParameters, RingParameters } from '../circuit/circuit.ts';
import { Refusal } from '../errors.ts';
import type { OutputPort } from '../filter/specification.ts';
import {
  compensatingRings,
  type IdealArms,
  idealArms,
  placeRings,
  REACH_SLACK,
  type Slot,
  withinReach,
} from './arms.ts';
import { type TakenEnds, takeEnds } from './balance.ts';
import { armOfRing, couplerOf, ringCount } from './elements.ts';
import { powerPerTurn } from './lossy.ts';
import type { ChipModel } from './model.ts';
import type { CellPlan } from './placed.ts';
import { furthest, tooFewRings } from './refusals.ts';

/** Cells first…last, one cell where they are equal. */
export interface Run {
  readonly first: number;
  readonly last: number;
}

export interface RunRequest {
  readonly ideal: InterferometerParameters;
  /** The output of `ideal` that carries the filter, and the output of the run that shall carry it. */
  readonly carriedOn: OutputPort;
  readonly port: OutputPort;
  /** Number of the section, null for an all-pass pair. */
  readonly section: number | null;
  readonly parkAtRad: number;
  /** What leaves by the other output is used too. */
  readonly bothOutputs: boolean;
}

export interface PlannedCells {
  readonly plans: readonly CellPlan[];
  /** What it spoils: coupling of parked rings that neither decouple nor cancel, couplers off their route. 0 is clean. */
  readonly leak: number;
  /** Rings used only as delay: each costs a turn of loss. */
  readonly delayRings: number;
  /** Σ|K − wanted| of input and output couplers: 0 is exact. */
  readonly couplersOff: number;
  /** Σ of the fields that such couplers leave in nulls of the outputs in use. */
  readonly nullField: number;
}

export function slotsOf(chip: ChipModel, run: Run): readonly [readonly Slot[], readonly Slot[]] {
  const slots: [Slot[], Slot[]] = [[], []];
  for (let index = run.first; index <= run.last; index++) {
    const cell = chip.cells[index]!;
    for (let ring = 0; ring < ringCount(cell); ring++) {
      const name = `ring${ring + 1}`;
      const slot = { cell: index, ring, element: `${cell.name}.${name}`, coupler: couplerOf(cell, name) };
      slots[armOfRing(cell, ring)].push(slot);
    }
  }
  return slots;
}

/** Plain delay of each arm through the run. */
export function delayOf(chip: ChipModel, run: Run): readonly [number, number] {
  const cells = chip.cells.slice(run.first, run.last + 1);
  return [
    cells.reduce((sum, cell) => sum + cell.armDelay[0], 0),
    cells.reduce((sum, cell) => sum + cell.armDelay[1], 0),
  ];
}

interface Variant {
  readonly arms: IdealArms;
  readonly inputCoupling: number;
  readonly outputCoupling: number;
  /** Phase of arm 1 against arm 0. */
  readonly armPhaseRad: number;
}

/**
 * The same filter on the port asked for, with the arms as they are and exchanged.
 * Other output: K_out → 1−K_out and arm phase + π give (out1, out2) → (j·out2, −j·out1). Arms exchanged: K → 1−K at both
 * ends gives (−out1, out2). Both follow from out1 = t_o·t_i·A₀ − κ_o·κ_i·A₁, out2 = −j(κ_o·t_i·A₀ + t_o·κ_i·A₁).
 */
function variantsOf({ ideal, carriedOn, port }: RunRequest): readonly [Variant, Variant] {
  const arms = idealArms(ideal);
  const moved = carriedOn !== port;
  const outputCoupling = moved ? 1 - ideal.outputCoupling : ideal.outputCoupling;
  const armPhaseRad = arms[1].phaseRad - arms[0].phaseRad + (moved ? Math.PI : 0);
  const { inputCoupling } = ideal;
  return [
    { arms, inputCoupling, outputCoupling, armPhaseRad },
    {
      arms: [arms[1], arms[0]],
      inputCoupling: 1 - inputCoupling,
      outputCoupling: 1 - outputCoupling,
      armPhaseRad: -armPhaseRad,
    },
  ];
}

/** Rings at K = 1 that make good the delays; refuses counts that the run's arms do not hold. */
function fullRings(chip: ChipModel, run: Run, arms: IdealArms, ringDelay: number): readonly [number, number] {
  const slots = slotsOf(chip, run);
  const names = chip.cells.slice(run.first, run.last + 1).map((cell) => cell.name);
  const full = compensatingRings([arms[0].delay, arms[1].delay], delayOf(chip, run), ringDelay);
  const given = [arms[0].rings.length, arms[1].rings.length];
  const allowed = [slots[0].length, slots[1].length];
  if (full === null)
    throw tooFewRings(
      `The plain delays of the arms of ${names.join(' and ')} differ from the filter's by no whole number of turns.`,
      [arms[0].delay, arms[1].delay],
      delayOf(chip, run),
    );
  if (given[0]! + full[0] > allowed[0]! || given[1]! + full[1] > allowed[1]!) {
    const delays = full[0] + full[1] > 0 ? ` and ${full[0] + full[1]} more as plain delay` : '';
    throw tooFewRings(
      `The filter needs ${given[0]} and ${given[1]} rings on the two arms${delays}; ${names.join(' and ')} ` +
        `has ${allowed[0]} and ${allowed[1]}.`,
      given,
      allowed,
    );
  }
  return full;
}

function commonRingDelay(chip: ChipModel, run: Run, rings: readonly RingParameters[]): number {
  const { ringDelay, name } = chip.cells[run.first]!;
  const cells = chip.cells.slice(run.first, run.last + 1);
  const differs = cells.some((cell) => cell.ringDelay !== ringDelay);
  const wrong = rings.find((ring) => Math.abs(ring.delay - ringDelay) > REACH_SLACK);
  if (differs || wrong)
    throw tooFewRings(
      `The filter needs rings of ${wrong?.delay ?? ringDelay} unit delays; those of ${name} have ${ringDelay}.`,
      wrong?.delay ?? ringDelay,
      ringDelay,
    );
  return ringDelay;
}

/** Both end couplings, and where they are not as wanted, what was. */
function endsOf(
  chip: ChipModel,
  run: Run,
  request: RunRequest,
  { inputCoupling, outputCoupling }: Variant,
): { readonly taken: TakenEnds; readonly missed: Pick<CellPlan, 'offBalance'> } {
  const [first, last] = [chip.cells[run.first]!, chip.cells[run.last]!];
  const { port, bothOutputs } = request;
  const wanted = { inputCoupling, outputCoupling };
  const taken = takeEnds({
    inputPath: `${first.name}.input.coupling`,
    outputPath: `${last.name}.output.coupling`,
    input: couplerOf(first, 'input'),
    output: couplerOf(last, 'output'),
    wanted,
    port,
    bothOutputs,
  });
  return {
    taken,
    missed: taken.couplersOff > 0 ? { offBalance: { ...run, wanted, port, passes: false } } : {},
  };
}

function planVariant(chip: ChipModel, run: Run, request: RunRequest, variant: Variant): PlannedCells {
  const { arms } = variant;
  const ringDelay = commonRingDelay(chip, run, [...arms[0].rings, ...arms[1].rings]);
  const full = fullRings(chip, run, arms, ringDelay);
  const slots = slotsOf(chip, run);
  const remaining = powerPerTurn(chip, ringDelay);
  const rings = placeRings(slots, [arms[0].rings, arms[1].rings], full, remaining, request.parkAtRad);
  const armPhaseRad = variant.armPhaseRad + Math.PI * (full[0] - full[1]);
  const allSlots = [...slots[0], ...slots[1]];
  const { taken, missed } = endsOf(chip, run, request, variant);
  const { couplersOff, nullField } = taken;
  const plans: CellPlan[] = [];
  for (let index = run.first; index <= run.last; index++) {
    const cell = chip.cells[index]!;
    const ends = index === run.last;
    const dark = (element: 'input' | 'output') =>
      withinReach(`${cell.name}.${element}.coupling`, couplerOf(cell, element), 0);
    const carries = {
      OUT1: 'COMPLEMENT',
      OUT2: 'COMPLEMENT',
      [request.port]: request.section === null ? 'FILTER' : 'SECTION',
    } as CellPlan['carries'];
    plans.push({
      section: request.section,
      inputCoupling: index === run.first ? taken.inputCoupling : dark('input'),
      outputCoupling: ends ? taken.outputCoupling : dark('output'),
      armPhaseRad: ends ? armPhaseRad : 0,
      rings: allSlots
        .filter((slot) => slot.cell === index)
        .sort((a, b) => a.ring - b.ring)
        .map((slot) => rings.plans.get(slot)!),
      carries: ends ? carries : { OUT1: 'ARM', OUT2: 'ARM' },
      parked: rings.parked.filter(({ element }) => element.startsWith(`${cell.name}.`)),
      ...(ends ? missed : {}),
    });
  }
  return { plans, leak: rings.leak, delayRings: full[0] + full[1], couplersOff, nullField };
}

/** Exact couplers first, then nulls that are left whole, then what parked rings spoil, then loss. */
export function isCleaner(a: PlannedCells, b: PlannedCells): boolean {
  const costs = (planned: PlannedCells) => [
    planned.couplersOff > 0 ? 1 : 0,
    planned.nullField,
    planned.leak,
    planned.couplersOff,
    planned.delayRings,
  ];
  const [mine, other] = [costs(a), costs(b)];
  const k = mine.findIndex((cost, index) => Math.abs(cost - other[index]!) > REACH_SLACK);
  return k >= 0 && mine[k]! < other[k]!;
}

/** The cleanest way to realise the ideal on these cells, or the refusal that came furthest. */
export function planRun(chip: ChipModel, run: Run, request: RunRequest): PlannedCells {
  let best: PlannedCells | null = null;
  const refusals: Refusal[] = [];
  for (const variant of variantsOf(request)) {
    try {
      const planned = planVariant(chip, run, request, variant);
      if (best === null || isCleaner(planned, best)) best = planned;
    } catch (reason) {
      if (!(reason instanceof Refusal)) throw reason;
      refusals.push(reason);
    }
  }
  if (best === null) throw furthest(refusals);
  return best;
}
