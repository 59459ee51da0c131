/** One filter on one chip in one architecture, and how it does there with the chip's losses. */
import type { ChipModel, PlacedCircuit } from '../chip/index.ts';
import { fitToChip, withChipLosses } from '../chip/index.ts';
import type { Architecture, FilterPlan, OutputPort } from '../filter/index.ts';
import { pairPoles, toSections } from '../filter/index.ts';
import type { Compliance } from '../response/index.ts';
import { powerExtremes, toDb } from '../response/index.ts';
import { synthesiseAllPassPair } from '../synthesis/index.ts';
import type { TradeOffRecord, TransferFunctionRecord } from './design.ts';
import { judge, otherPort, sourcesOf } from './judge.ts';
import { darkRecord, transferFunctionRecord } from './records.ts';

export interface Realisation {
  readonly plan: FilterPlan;
  readonly architecture: Architecture;
  readonly placed: PlacedCircuit;
  /** With the chip's losses, before any setting. */
  readonly onChip: Compliance;
  /** What the realisation has to say beyond its figures. */
  readonly remarks: readonly string[];
  /** Loss against stop edge, where there is one to report; takes seconds. */
  readonly tradeOff?: (onProgress: (part: number) => void) => readonly TradeOffRecord[];
  readonly transferFunctions: () => Readonly<Record<OutputPort, TransferFunctionRecord>>;
}

/** Where rings that cannot decouple do least harm: in the middle of the transition. */
export function parkAngle(plan: FilterPlan): number {
  const stop = plan.stopEdgeRad ?? Math.PI;
  return plan.centreRad + (plan.passEdgeRad + stop) / 2;
}

export function usesBothOutputs(plan: FilterPlan): boolean {
  return plan.mask.bands.some((band) => band.output !== plan.output);
}

/** Whether no light is led to an output of the chip: a cell that passes the filter on has its other output dark. */
export function isDark(placed: PlacedCircuit, output: OutputPort): boolean {
  const { carries } = placed.cells.at(-1)!;
  return carries[output] === 'NOTHING' && carries[otherPort(output)] === 'PASSED_ON';
}

/** The all-pass pair: exact, no loss of its own. Throws `Refusal` where the chip cannot hold it. */
export function realisePair(plan: FilterPlan, chip: ChipModel): Realisation {
  const { interferometer } = synthesiseAllPassPair(plan.filter, plan.output);
  const placed = fitToChip({ architecture: 'ALL_PASS_PAIR', cell: interferometer }, chip, {
    output: plan.output,
    parkAtRad: parkAngle(plan),
    bothOutputs: usesBothOutputs(plan),
  });
  return {
    plan,
    architecture: 'ALL_PASS_PAIR',
    placed,
    onChip: judge(withChipLosses(placed.circuit, chip), plan.mask, chip.fsrGhz),
    remarks: [],
    transferFunctions: () => {
      const complement = plan.complement();
      const record = (filter: typeof complement) =>
        transferFunctionRecord(filter, toSections(filter, pairPoles(filter, plan.centreRad)));
      const own = record(plan.filter);
      const other = isDark(placed, otherPort(plan.output)) ? darkRecord() : record(complement);
      return plan.output === 'OUT1' ? { OUT1: own, OUT2: other } : { OUT1: other, OUT2: own };
    },
  };
}

/** Loss at the best point of the passband, dB, with the chip's losses. */
export function insertionLossOf({ plan, placed }: Realisation, chip: ChipModel): number | null {
  const sources = sourcesOf(withChipLosses(placed.circuit, chip), chip.fsrGhz);
  const passbands = plan.mask.bands.filter(
    (band) => band.output === plan.output && band.minTransmissionDb !== undefined,
  );
  if (passbands.length === 0) return null;
  return -Math.max(
    ...passbands.map((band) => toDb(powerExtremes(sources[plan.output], band).greatest.value)),
  );
}
