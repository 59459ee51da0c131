/** What is compared: one family in one architecture at one order, as far as it came on the chip. */
import { type ChipModel, circuitOfSetting, type Setting, solveSetting } from '../chip/index.ts';
import { Refusal } from '../errors.ts';
import type { Architecture, Family } from '../filter/index.ts';
import type { Compliance } from '../response/index.ts';
import { judge } from './judge.ts';
import type { Realisation } from './realisation.ts';

/** The best realisation on the chip, or why there is none. */
export interface Group {
  readonly family: Family;
  readonly architecture: Architecture;
  readonly order: number;
  readonly best: Realisation | null;
  readonly refusal: Refusal | null;
}

/** With its currents, and judged by what they make of the chip: crosstalk, driver steps and losses in. */
export interface SetGroup extends Group {
  readonly best: Realisation;
  readonly refusal: null;
  readonly setting: Setting;
  readonly compliance: Compliance;
}

export const isSet = (group: Group): group is SetGroup => 'setting' in group;

const isOpen = (group: Group): group is Group & { readonly best: Realisation } => group.best !== null;

/** Every group that has a realisation gets its setting; one whose heaters cannot do it keeps the reason instead. */
export function withSettings(groups: readonly Group[], chip: ChipModel): Group[] {
  return groups.map((group) => {
    if (!isOpen(group)) return group;
    try {
      const setting = solveSetting(group.best.placed, chip);
      const compliance = judge(circuitOfSetting(setting, chip), group.best.plan.mask, chip.fsrGhz);
      return { ...group, refusal: null, setting, compliance };
    } catch (error) {
      if (!(error instanceof Refusal)) throw error;
      return { ...group, refusal: error };
    }
  });
}

/**
 * The preferred one: those that meet the mask first, cheapest (fewest rings) first and then by margin; else the one that
 * misses it by least. Throws when none could be set: why the one nearest to the mask could not, else the first refusal.
 */
export function choose(groups: readonly Group[]): SetGroup {
  const ranked = groups.filter(isSet).sort((a, b) => {
    const met = Number(b.compliance.met) - Number(a.compliance.met);
    if (met !== 0) return met;
    const margin = b.compliance.worstMarginDb - a.compliance.worstMarginDb;
    return a.compliance.met ? a.order - b.order || margin : margin;
  });
  if (ranked[0]) return ranked[0];
  const placed = groups
    .filter(isOpen)
    .sort((a, b) => b.best.onChip.worstMarginDb - a.best.onChip.worstMarginDb)[0];
  throw (
    placed?.refusal ??
    groups.find((group) => group.refusal !== null)?.refusal ??
    new Error('nothing was compared')
  );
}
