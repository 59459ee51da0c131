/**
 * The whole way: question → filters → circuits → chip → setting → response → compliance. Which filter and which
 * architecture is decided by what their settings do on this chip: simulated back through crosstalk, rounding and losses.
 */
import { type ChipModel, circuitOfSetting } from '../chip/index.ts';
import { Refusal } from '../errors.ts';
import { alternativeOf, cascadeBeside, reasonFor } from './alternatives.ts';
import { cascadeGroup } from './cascade-group.ts';
import { plansFor } from './check-question.ts';
import type { Design, DesignQuestion } from './design.ts';
import { choose, type Group, isSet, type SetGroup, withSettings } from './groups.ts';
import { figureBands, figuresFrom, sourcesOf } from './judge.ts';
import { withNearest } from './nearest.ts';
import { pairGroups } from './pair-groups.ts';
import { cellRecord } from './records.ts';

export interface DesignHooks {
  /** Called with a fraction in [0, 1], never falling. */
  readonly onProgress?: (fraction: number) => void;
}

/** Shares of the work after which progress is told: pairs compared, cascades compared. */
const PAIRS = 0.4;
const COMPARED = 0.8;

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
  const { architecture } = question.synthesis;
  const tell = hooks.onProgress ?? (() => {});
  const families = plansFor(question, chip);
  const pairs =
    architecture === 'SECTION_CASCADE'
      ? []
      : withSettings(
          pairGroups(families, chip, (part) => tell(PAIRS * part)),
          chip,
        );
  const cascades = wantsCascade(question, pairs)
    ? withSettings(
        cascadeGroup(families, chip, (part) => tell(PAIRS + (COMPARED - PAIRS) * part)),
        chip,
      )
    : [];
  const groups = [...pairs, ...cascades];
  tell(COMPARED);
  const chosen = choose(groups);
  const design = designOf(chosen, groups, chip, architecture !== undefined, (part) =>
    tell(COMPARED + (1 - COMPARED) * part),
  );
  tell(1);
  return design;
}

/**
 * A cascade takes seconds and loses light, so it is tried where it is asked for or where no pair serves: none can be set,
 * or a mask is missed. A family's own edges are never missed for that: the pair is the filter that was asked for.
 */
function wantsCascade({ specification, synthesis }: DesignQuestion, pairs: readonly Group[]): boolean {
  if (synthesis.architecture !== undefined) return synthesis.architecture === 'SECTION_CASCADE';
  const set = pairs.filter(isSet);
  return set.length === 0 || (specification.mask !== undefined && !set.some((pair) => pair.compliance.met));
}

function designOf(
  chosen: SetGroup,
  groups: readonly Group[],
  chip: ChipModel,
  told: boolean,
  tellTradeOff: (part: number) => void,
): Design {
  const { best: realisation, setting, compliance } = chosen;
  const { plan, placed, architecture } = realisation;
  const sources = sourcesOf(circuitOfSetting(setting, chip), chip.fsrGhz);
  const centreGhz = (plan.centreRad * chip.fsrGhz) / (2 * Math.PI);
  return {
    order: plan.order,
    family: plan.family,
    architecture,
    reason: reasonFor(chosen, groups, told),
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
