/** What the joint optimisation of a cascade is told about chip and mask. */
import type { ChipModel } from '../chip/index.ts';
import { Refusal } from '../errors.ts';
import type { FilterPlan, OutputPort } from '../filter/index.ts';
import {
  type CascadeGoal,
  type CascadeOptions,
  type OmegaMask,
  type OptimisedCascade,
  optimiseCascade,
} from '../synthesis/index.ts';

const TURN = 2 * Math.PI;

/** Kept in reserve within passbands and stopbands for what the driver's rounding will add, dB. */
const PASS_RESERVE_DB = 0.02;
const STOP_RESERVE_DB = 0.1;

/** A ring nearer to undercoupling than this is refused on the chip; the optimiser keeps away from it. */
const UNDERCOUPLING_MARGIN = 1.05;

/** Below this loss of one turn (dB) balanced couplers are as good as free ones. */
const NEARLY_LOSSLESS_DB = 0.1;

export function optionsFor(chip: ChipModel): Partial<CascadeOptions> {
  const { unitDelayLossDb, couplerExcessLossDb } = chip.losses;
  const turnDb = unitDelayLossDb + couplerExcessLossDb;
  const undercoupled = 1 - 10 ** (-turnDb / 10);
  const rings = reachOf(chip, (element) => element.startsWith('ring'));
  const ends = reachOf(chip, (element) => !element.startsWith('ring'));
  const leastUseful = Math.max(1e-3, UNDERCOUPLING_MARGIN * undercoupled);
  if (leastUseful > rings.max) refuseCouplings(leastUseful, rings.max, turnDb);
  return {
    losses: { ringLossDb: unitDelayLossDb, couplerExcessLossDb },
    couplers: turnDb > NEARLY_LOSSLESS_DB && ends.min === 0 && ends.max === 1 ? 'FREE' : 'BALANCED',
    // Reaches that do not meet leave one value to start from; what fits each ring is decided when it is placed.
    minimumCoupling: Math.min(rings.max, Math.max(leastUseful, rings.min)),
    maximumCoupling: rings.max,
  };
}

function refuseCouplings(leastNeeded: number, greatest: number, turnDb: number): never {
  throw new Refusal({
    code: 'SPECIFICATION_UNREACHABLE',
    limit: 'COUPLING_RANGE',
    detail:
      `A ring of this chip loses ${turnDb} dB a turn: it shapes light only if coupled by more than ` +
      `${leastNeeded.toPrecision(6)}, and what all its rings reach ends at ${greatest}.`,
    given: greatest,
    allowed: { above: leastNeeded },
  });
}

export function optimiseOver(
  plan: FilterPlan,
  outputs: readonly OutputPort[],
  mask: OmegaMask,
  options: Partial<CascadeOptions>,
): OptimisedCascade {
  return optimiseCascade(plan.filter, outputs, mask, { ...options, goal: goalOf(mask) });
}

/** A mask that counts from the input limits the loss itself; against the peak nothing else does. */
export function goalOf(mask: OmegaMask): CascadeGoal {
  return mask.reference === 'INPUT' ? 'GREATEST_MARGIN' : 'LEAST_LOSS';
}

/** The reach that all of these couplers have. */
function reachOf(chip: ChipModel, isMeant: (element: string) => boolean): { min: number; max: number } {
  const couplers = chip.cells.flatMap((cell) => cell.couplers.filter((coupler) => isMeant(coupler.element)));
  return {
    min: Math.max(0, ...couplers.map((coupler) => coupler.minCoupling)),
    max: Math.min(1, ...couplers.map((coupler) => coupler.maxCoupling)),
  };
}

/** The plan's mask over Ω, with the reserve for rounding in its levels. */
export function omegaMaskOf({ mask }: FilterPlan, fsrGhz: number): OmegaMask {
  return {
    reference: mask.reference,
    bands: mask.bands.map((band) => ({
      lowRad: (TURN * band.lowGhz) / fsrGhz,
      highRad: (TURN * Math.min(band.highGhz, band.lowGhz + fsrGhz)) / fsrGhz,
      ...(band.minTransmissionDb === undefined
        ? {}
        : { minTransmissionDb: Math.min(0, band.minTransmissionDb + PASS_RESERVE_DB) }),
      ...(band.maxTransmissionDb === undefined
        ? {}
        : { maxTransmissionDb: band.maxTransmissionDb - STOP_RESERVE_DB }),
    })),
  };
}
