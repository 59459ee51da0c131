/**
 * The whole way: question → filters → circuits → chip → setting → response → compliance. Which filter and which
 * architecture is decided by what they do on this chip with its losses; the setting is then simulated back through
 * crosstalk and rounding, and that response is what is judged.
 */
import { type ChipModel, circuitOfSetting, type Setting, solveSetting } from '../chip/index.ts';
import { Refusal } from '../errors.ts';
import { complianceOf } from '../response/index.ts';
import { alternativeOf, cascadeBeside, type Group, type OpenGroup, rank, reasonFor } from './alternatives.ts';
import { cascadeGroup } from './cascade-group.ts';
import { plansFor } from './check-question.ts';
import type { Design, DesignQuestion } from './design.ts';
import { figureBands, figuresFrom, sourcesOf } from './judge.ts';
import { withNearest } from './nearest.ts';
import { pairGroups } from './pair-groups.ts';
import type { Realisation } from './realisation.ts';
import { cellRecord } from './records.ts';

export interface DesignHooks {
  /** Called with a fraction in [0, 1], never falling. */
  readonly onProgress?: (fraction: number) => void;
}

/** Shares of the work after which progress is told: candidates compared, setting solved. */
const COMPARED = 0.8;
const SET = 0.9;

/**
 * @throws Refusal when no circuit or setting exists; `NoConvergence` when a solver gives up (a defect)
 * Cost: milliseconds for the family form as an all-pass pair, up to seconds for masks and cascades.
 */
export function computeDesign(question: DesignQuestion, chip: ChipModel, hooks: DesignHooks = {}): Design {
  try {
    return designFor(question, chip, hooks);
  } catch (error) {
    throw error instanceof Refusal ? withNearest(error, question, chip) : error;
  }
}

function designFor(question: DesignQuestion, chip: ChipModel, hooks: DesignHooks): Design {
  const { synthesis } = question;
  const tell = hooks.onProgress ?? (() => {});
  const families = plansFor(question, chip);
  const groups: Group[] = [];
  if (synthesis.architecture !== 'SECTION_CASCADE')
    groups.push(...pairGroups(families, chip, (part) => tell(0.4 * part)));
  const pairFits = groups.some((group) => group.best !== null);
  if (synthesis.architecture === 'SECTION_CASCADE' || !pairFits) {
    groups.push(...cascadeGroup(families, chip, (part) => tell(0.4 + (COMPARED - 0.4) * part)));
  }
  tell(COMPARED);
  const ranked = rank(groups);
  const { group, setting } = firstThatSets(ranked, chip);
  tell(SET);
  const told = synthesis.architecture !== undefined;
  const design = designOf(group, setting, groups, chip, told, (part) => tell(SET + (1 - SET) * part));
  tell(1);
  return design;
}

/** The best realisation whose heaters stay within their limits; if none does, why the best does not. */
function firstThatSets(
  ranked: readonly OpenGroup[],
  chip: ChipModel,
): { group: OpenGroup; setting: Setting } {
  let first: Refusal | null = null;
  for (const group of ranked) {
    try {
      return { group, setting: solveSetting(group.best.placed, chip) };
    } catch (error) {
      if (!(error instanceof Refusal)) throw error;
      first ??= error;
    }
  }
  throw first ?? new Error('nothing was ranked');
}

function designOf(
  chosen: OpenGroup,
  setting: Setting,
  groups: readonly Group[],
  chip: ChipModel,
  told: boolean,
  tellTradeOff: (part: number) => void,
): Design {
  const realisation: Realisation = chosen.best;
  const { plan, placed, architecture } = realisation;
  const sources = sourcesOf(circuitOfSetting(setting, chip), chip.fsrGhz);
  const compliance = complianceOf(sources, plan.mask);
  const centreGhz = (plan.centreRad * chip.fsrGhz) / (2 * Math.PI);
  return {
    order: plan.order,
    family: plan.family,
    architecture,
    reason: reasonFor(chosen, groups, told, compliance),
    alternatives: [
      ...groups.map((group) => alternativeOf(group, group === chosen, chip)),
      ...cascadeBeside(chosen, groups, chip),
    ],
    output: plan.output,
    transferFunctions: realisation.transferFunctions(),
    cells: placed.cells.map(cellRecord),
    circuit: placed.circuit,
    setting,
    tradeOff: realisation.tradeOff?.(tellTradeOff) ?? [],
    centreGhz,
    mask: plan.mask,
    compliance,
    figures: figuresFrom(
      sources,
      plan.output,
      figureBands(plan.mask, plan.output, plan.output, centreGhz, chip.fsrGhz),
    ),
  };
}
