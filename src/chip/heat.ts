/** The least heat that meets the wanted phases: one linear problem, whole turns, coupler branches. */
import { Refusal } from '../errors.ts';
import { type BranchSolution, searchBranches } from './branches.ts';
import { channelLimit, powerMw, roundToStep } from './currents.ts';
import { phaseGain } from './heaters.ts';
import { invert } from './linear.ts';
import type { ChipModel } from './model.ts';
import { type PhaseDemand, type ThermalTargets, UNDRIVEN_SLACK, wantedPhase } from './targets.ts';
import { exchangeTurns, isBetter, leastTurns, type WrapProblem, type WrapSolution } from './wraps.ts';

const TURN = 2 * Math.PI;

/** Beyond this the heaters used cannot be told apart and powers would be rounding noise. */
const MAX_CONDITION = 1e6;

/** So many of the best branch choices go into the exchange of turns. */
const BRANCHES_TO_POLISH = 8;

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
        "The crosstalk matrix of this chip's channels is nearly singular: the heaters cannot be set apart.",
      given: inverted?.condition ?? null,
      allowed: { max: MAX_CONDITION },
    });
  const channels = demands.map((demand) => chip.channels[demand.channel]!);
  const problem: WrapProblem = {
    gain,
    inverse: inverted.inverse,
    floorMw: Float64Array.from(channels, (channel) => chip.heaterFloorRad / channel.phasePerMw),
    limitMw: Float64Array.from(channels, (channel) =>
      powerMw(roundToStep(channelLimit(channel).currentMa, channel), channel.resistanceOhm),
    ),
  };
  return { demands, resting: targets.demands.filter((demand) => !isDriven(demand)), problem };
}

/** Distance from the nearest whole turn, rad. */
export const offTurn = (phaseRad: number): number => Math.abs(phaseRad - TURN * Math.round(phaseRad / TURN));

/** Wanted phases less the phases at zero power. */
export function liftFromRest(
  demands: readonly PhaseDemand[],
  chip: ChipModel,
  branches: Uint8Array,
): Float64Array {
  return Float64Array.from(demands, (demand) =>
    demand.terms.reduce(
      (phase, { channel, weight }) => phase - weight * chip.channels[channel]!.phaseAtZeroRad,
      wantedPhase(demand, branches),
    ),
  );
}

/**
 * Coupler branches, turns and powers of the least total heat found. Few couplers: every branch choice; the best go through
 * the exchange of turns. Throws a Refusal where no branch choice leaves an undriven element where it has to be.
 */
export function leastHeat(heating: Heating, targets: ThermalTargets, chip: ChipModel): BranchSolution {
  const { demands, resting, problem } = heating;
  const missed = (branches: Uint8Array) =>
    resting.reduce((sum, demand) => sum + offTurn(wantedPhase(demand, branches)), 0);
  const evaluate = (branches: Uint8Array): WrapSolution => {
    const solution = leastTurns(problem, liftFromRest(demands, chip, branches));
    const penalty = UNDRIVEN_PENALTY_MW * missed(branches);
    return resting.length === 0 ? solution : { ...solution, violationMw: solution.violationMw + penalty };
  };
  const polished = searchBranches(targets.branches, evaluate, BRANCHES_TO_POLISH).map((candidate) => {
    const exchanged = exchangeTurns(
      problem,
      leastTurns(problem, liftFromRest(demands, chip, candidate.branches)),
    );
    const penalty = UNDRIVEN_PENALTY_MW * missed(candidate.branches);
    const violationMw = exchanged.violationMw + (resting.length === 0 ? 0 : penalty);
    return { branches: candidate.branches, solution: { ...exchanged, violationMw } };
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
