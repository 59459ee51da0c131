/** The least heat that meets the wanted phases: one linear problem, whole turns, coupler branches. */
import { Refusal } from '../errors.ts';
import { type BranchSolution, searchBranches } from './branches.ts';
import { channelLimit, powerMw, roundToStep } from './currents.ts';
import { phaseGain } from './heaters.ts';
import { invert } from './linear.ts';
import type { ChipModel } from './model.ts';
import { type PhaseDemand, type ThermalTargets, UNDRIVEN_SLACK, wantedPhase } from './targets.ts';
import {
  exchangeTurns,
  isBetter,
  leastTurns,
  type WrapProblem,
  type WrapSolution,
  wrapProblem,
} from './wraps.ts';

const TURN = 2 * Math.PI;

/** Beyond this the heaters used cannot be told apart and powers would be rounding noise. */
const MAX_CONDITION = 1e6;

/** So many of the best branch choices go into the exchange of turns. */
const BRANCHES_TO_POLISH = 4;

/** mW of limit counted for each rad of an undriven element that a branch choice leaves wrong: it outweighs any heat. */
const UNDRIVEN_PENALTY_MW = 1e9;

export interface Heating {
  readonly demands: readonly (PhaseDemand & { readonly channel: number })[];
  readonly resting: readonly PhaseDemand[];
  readonly problem: WrapProblem;
}

const isDriven = (demand: PhaseDemand): demand is PhaseDemand & { readonly channel: number } =>
  demand.channel !== null;

/** The linear problem of all driven demands. Throws a Refusal where the heaters used cannot be told apart. Cost O(m³). */
export function heatingOf(targets: ThermalTargets, chip: ChipModel): Heating {
  const demands = targets.demands.filter(isDriven);
  const m = demands.length;
  const gain = new Float64Array(m * m);
  demands.forEach((demand, row) => {
    demands.forEach((other, column) => {
      for (const { channel, weight } of demand.terms)
        gain[row * m + column]! += weight * phaseGain(chip, channel, other.channel);
    });
  });
  const inverted = invert(gain, m);
  if (inverted === null || inverted.condition > MAX_CONDITION)
    throw new Refusal({
      code: 'SETTING_UNREACHABLE',
      detail:
        'The heaters of this chip cannot be set apart: what they do to its phases (phasePerMw and crosstalk together) is a nearly singular matrix.',
      given: inverted?.condition ?? null,
      allowed: { max: MAX_CONDITION },
    });
  const channels = demands.map((demand) => chip.channels[demand.channel]!);
  const problem = wrapProblem(
    gain,
    inverted.inverse,
    Float64Array.from(channels, (channel) => chip.heaterFloorRad / channel.phasePerMw),
    Float64Array.from(channels, (channel) =>
      powerMw(roundToStep(channelLimit(channel).currentMa, channel), channel.resistanceOhm),
    ),
  );
  return { demands, resting: targets.demands.filter((demand) => !isDriven(demand)), problem };
}

/** Distance from the nearest whole turn, rad. */
export const offTurn = (phaseRad: number): number => Math.abs(phaseRad - TURN * Math.round(phaseRad / TURN));

/** Wanted phases less the phases at rest: on the branches +θ, and what −θ of each coupler adds. */
export interface Lifts {
  readonly plusRad: Float64Array;
  readonly changeRad: readonly Float64Array[];
}

export function liftsOf(demands: readonly PhaseDemand[], branches: number, chip: ChipModel): Lifts {
  const rest = (demand: PhaseDemand) =>
    demand.terms.reduce(
      (sum, { channel, weight }) => sum + weight * chip.channels[channel]!.phaseAtZeroRad,
      0,
    );
  const onPlus = new Uint8Array(branches);
  return {
    plusRad: Float64Array.from(demands, (demand) => wantedPhase(demand, onPlus) - rest(demand)),
    changeRad: Array.from({ length: branches }, (_, branch) =>
      Float64Array.from(demands, ({ parts }) =>
        parts.reduce((sum, part) => (part.coupler === branch ? sum + part.minusRad - part.plusRad : sum), 0),
      ),
    ),
  };
}

function liftOn({ plusRad, changeRad }: Lifts, branches: Uint8Array): Float64Array {
  const lift = Float64Array.from(plusRad);
  for (let k = 0; k < changeRad.length; k++) {
    if (branches[k] === 0) continue;
    const change = changeRad[k]!;
    for (let i = 0; i < lift.length; i++) lift[i]! += change[i]!;
  }
  return lift;
}

export interface LeastHeat extends BranchSolution {
  /** The same branches with every floor kept, whatever the limits say: where limits cannot be met, what they would have to be. */
  readonly floorsKept: WrapSolution;
}

/**
 * Coupler branches, turns and powers of the least total heat found. Few couplers: every branch choice; the best go through
 * the exchange of turns. Throws a Refusal where no branch choice leaves an undriven element where it has to be.
 */
export function leastHeat(heating: Heating, targets: ThermalTargets, chip: ChipModel): LeastHeat {
  const { demands, resting, problem } = heating;
  const lifts = liftsOf(demands, targets.branches, chip);
  const penalise = (solution: WrapSolution, branches: Uint8Array): WrapSolution => {
    if (resting.length === 0) return solution;
    const missed = resting.reduce((sum, demand) => sum + offTurn(wantedPhase(demand, branches)), 0);
    return { ...solution, violationMw: solution.violationMw + UNDRIVEN_PENALTY_MW * missed };
  };
  const evaluate = (branches: Uint8Array): WrapSolution =>
    penalise(leastTurns(problem, liftOn(lifts, branches)), branches);
  const polished = searchBranches(targets.branches, evaluate, BRANCHES_TO_POLISH).map(({ branches }) => {
    const start = leastTurns(problem, liftOn(lifts, branches));
    return { branches, solution: penalise(exchangeTurns(problem, start), branches), floorsKept: start };
  });
  const best = polished.reduce((a, b) => (isBetter(b.solution, a.solution) ? b : a));
  for (const demand of resting) {
    const wanted = wantedPhase(demand, best.branches);
    if (offTurn(wanted) > UNDRIVEN_SLACK)
      throw new Refusal({
        code: 'SETTING_UNREACHABLE',
        detail: `${demand.path} would need a phase of ${wanted.toPrecision(6)} rad; no channel drives it.`,
        element: demand.path,
        given: wanted,
        allowed: 0,
      });
  }
  return best;
}
