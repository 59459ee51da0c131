/**
 * The cascade of sections on the chip: exact sections first, then all cells optimised jointly over the mask with the
 * chip's losses; whichever does better there. Cascades take seconds where pairs take milliseconds, so one family (the
 * one asked for, else the most selective) is tried, at the least order and at one more where that misses.
 */
import { type ChipModel, fitToChip, withChipLosses } from '../chip/index.ts';
import type { InterferometerParameters } from '../circuit/index.ts';
import { Refusal } from '../errors.ts';
import type { Family, FamilyPlans, FilterPlan, OutputPort } from '../filter/index.ts';
import {
  type CascadeCell,
  productOf,
  sectionCount,
  sectionOf,
  synthesiseSectionCascade,
} from '../synthesis/index.ts';
import { orderOn } from './capacity.ts';
import { goalOf, omegaMaskOf, optimiseOver, optionsFor } from './cascade-optimisation.ts';
import type { TransferFunctionRecord } from './design.ts';
import type { Group } from './groups.ts';
import { judge, otherPort } from './judge.ts';
import { insertionLossOf, isDark, parkAngle, type Realisation, usesBothOutputs } from './realisation.ts';
import { darkRecord, transferFunctionRecord } from './records.ts';
import { tradeOffOf } from './trade-off.ts';

/** Most selective first: it needs the fewest cells. */
const PREFERENCE: readonly Family[] = ['ELLIPTIC', 'CHEBYSHEV_II', 'CHEBYSHEV_I', 'BUTTERWORTH'];

/** None where no filter there is has as many sections as the chip's cells hold. */
export function cascadeGroup(
  families: readonly FamilyPlans[],
  chip: ChipModel,
  onProgress: (part: number) => void,
): Group[] {
  const plans = plansTried(families, orderOn(chip, 'SECTION_CASCADE'));
  const groups: Group[] = [];
  for (const [index, plan] of plans.entries()) {
    const share = (part: number): void => onProgress((index + part) / plans.length);
    const { family, order } = plan;
    try {
      const best = realiseCascade(plan, chip, share);
      groups.push({ family, architecture: 'SECTION_CASCADE', order, best, refusal: null });
      if (best.onChip.met) break;
    } catch (error) {
      if (!(error instanceof Refusal)) throw error;
      groups.push({ family, architecture: 'SECTION_CASCADE', order, best: null, refusal: error });
    }
  }
  onProgress(1);
  return groups;
}

function plansTried(families: readonly FamilyPlans[], mostOrder: number): FilterPlan[] {
  for (const family of PREFERENCE) {
    const plans =
      families.find((one) => one.family === family)?.plans.filter((plan) => plan.order <= mostOrder) ?? [];
    const orders = [...new Set(plans.map((plan) => plan.order))].sort((a, b) => a - b);
    if (orders.length > 0) return orders.map((order) => plans.find((plan) => plan.order === order)!);
  }
  return [];
}

/** Exact sections and the jointly optimised ones, both placed and judged; the better one is returned. */
function realiseCascade(plan: FilterPlan, chip: ChipModel, onProgress: (part: number) => void): Realisation {
  if (usesBothOutputs(plan)) refuseBothOutputs();
  const outputs: OutputPort[] = Array.from({ length: sectionCount(plan.order) }, () => plan.output);
  const options = optionsFor(chip);
  const exact = synthesiseSectionCascade(plan.filter, outputs);
  const mask = omegaMaskOf(plan, chip.fsrGhz);
  const optimised = optimiseOver(plan, outputs, mask, { ...options, onProgress });
  const startingCells = [optimised.cells.map((cell) => cell.interferometer)];
  const tradeOff = (tell: (part: number) => void) =>
    tradeOffOf(
      plan,
      outputs,
      mask,
      { ...options, goal: goalOf(mask), startingCells, onProgress: tell },
      chip,
    );
  const first = attempt(plan, exact.cells, chip, [`Exact sections: ${exact.reason}`], tradeOff);
  const lossless = optimised.cells.map((cell) => withoutLosses(cell));
  const second = attempt(
    plan,
    lossless,
    chip,
    [
      optimised.reason,
      `Exact sections would lose ${exact.insertionLossDb.toFixed(2)} dB.`,
      ...lossRemark(chip),
    ],
    tradeOff,
  );
  if (first instanceof Refusal || second instanceof Refusal) {
    const open = [second, first].find((one) => !(one instanceof Refusal));
    if (open) return open as Realisation;
    throw first;
  }
  return isBetter(second, first, chip) ? second : first;
}

/** The optimum of a lossy chip is not that of a lossless one; whoever looks at the CIRCUIT stage should know. */
function lossRemark({ losses }: ChipModel): string[] {
  return losses.unitDelayLossDb + losses.couplerExcessLossDb > 0
    ? [
        "Couplings and phases are those that serve the mask with this chip's losses; without loss the same circuit is another filter.",
      ]
    : [];
}

function refuseBothOutputs(): never {
  throw new Refusal({
    code: 'SPECIFICATION_UNREACHABLE',
    detail:
      'A cascade of sections has the filter on one output only: what its cells reject is absorbed on the way and does not come out at the other. A mask for both outputs needs an all-pass pair.',
    limit: 'RINGS',
  });
}

function attempt(
  plan: FilterPlan,
  cells: readonly CascadeCell[],
  chip: ChipModel,
  remarks: readonly string[],
  tradeOff: NonNullable<Realisation['tradeOff']>,
): Realisation | Refusal {
  try {
    const placed = fitToChip(
      { architecture: 'SECTION_CASCADE', cells: cells.map((cell) => cell.interferometer) },
      chip,
      {
        output: plan.output,
        parkAtRad: parkAngle(plan),
      },
    );
    return {
      plan,
      architecture: 'SECTION_CASCADE',
      placed,
      onChip: judge(withChipLosses(placed.circuit, chip), plan.mask, chip.fsrGhz),
      remarks,
      tradeOff,
      transferFunctions: () => recordsOf(plan, cells, isDark(placed, otherPort(plan.output))),
    };
  } catch (error) {
    if (error instanceof Refusal) return error;
    throw error;
  }
}

/** With every demand kept, the one that loses least; else the one with the greater worst margin. */
function isBetter(a: Realisation, b: Realisation, chip: ChipModel): boolean {
  if (a.onChip.met !== b.onChip.met) return a.onChip.met;
  if (!a.onChip.met) return a.onChip.worstMarginDb > b.onChip.worstMarginDb;
  return (insertionLossOf(a, chip) ?? 0) < (insertionLossOf(b, chip) ?? 0);
}

/** The same couplings and phases without loss: what the transfer function and the CIRCUIT stage are of. */
function withoutLosses({ interferometer, output }: CascadeCell): CascadeCell {
  const bare: InterferometerParameters = {
    ...interferometer,
    couplerExcessLossDb: 0,
    arms: [stripped(interferometer.arms[0]), stripped(interferometer.arms[1])],
  };
  return { interferometer: bare, output, section: sectionOf(bare, output) };
}

function stripped(arm: InterferometerParameters['arms'][0]): InterferometerParameters['arms'][0] {
  return { ...arm, lossDb: 0, rings: arm.rings.map((ring) => ({ ...ring, lossDb: 0 })) };
}

/** The filter's output carries the product of all sections; the other one what the last cell takes out of it. */
function recordsOf(
  plan: FilterPlan,
  cells: readonly CascadeCell[],
  otherIsDark: boolean,
): Readonly<Record<OutputPort, TransferFunctionRecord>> {
  const sections = cells.map((cell) => cell.section);
  const own = transferFunctionRecord(productOf(sections), sections);
  const last = cells.at(-1)!;
  const beside = [...sections.slice(0, -1), sectionOf(last.interferometer, otherPort(last.output))];
  const other = otherIsDark ? darkRecord() : transferFunctionRecord(productOf(beside), beside);
  return plan.output === 'OUT1' ? { OUT1: own, OUT2: other } : { OUT1: other, OUT2: own };
}
