/**
 * Which poles share a section with which zeros. A cell of two rings can null a chosen zero; its other zero follows, so a
 * pair of poles and a pair of zeros go together only where that other zero is one of the filter's. Poles that mirror each
 * other about the filter's centre always qualify; any other pair is admitted on the same test and not assumed away.
 *
 * Enumerated up to 8 poles. Above, the rule of L. B. Jackson, "Roundoff-noise analysis for fixed-point digital filters
 * realized in cascade or parallel form", IEEE Trans. Audio Electroacoust. AU-18, 107 (1970): the pole pair nearest the
 * circle takes the nearest zeros, then the next (from memory).
 */
import type { Complex } from 'complex.js';
import { Refusal } from '../errors.ts';
import type { TransferFunction } from '../filter/index.ts';
import { cellOfNull } from './section.ts';

/** Enumeration grows as (N−1)!!·(N/2)!: 2,520 at eight poles before the zeros' test, out of reach at sixteen. */
const ENUMERATED_POLES = 8;

/** A derived zero this near to one of the filter's is that one: half the digits, as of a double zero. */
const SAME_ZERO = 1e-7;

/** Two or one pole with as many zeros, as indices into the filter's, and the size of the cell's leading coefficient. */
export interface SectionChoice {
  readonly poles: readonly number[];
  readonly zeros: readonly number[];
  readonly gain: number;
}

export interface Pairing {
  readonly choices: readonly SectionChoice[];
  readonly method: 'ENUMERATED' | 'NEAREST_ZEROS';
  /** Complete pairings looked at. */
  readonly considered: number;
  /** How much more light the chosen one passes than the worst of them, dB. */
  readonly spreadDb: number;
}

/** A choice while it is made: zeros are groups of equal zeros, the filter's own indices come last. */
interface Draft {
  readonly poles: readonly number[];
  readonly groups: readonly number[];
  readonly gain: number;
}

interface Table {
  /** Distinct zeros and how often each occurs. */
  readonly zeros: readonly { readonly value: Complex; readonly members: readonly number[] }[];
  /** By pole, the pairs it can lead: partner, two distinct zeros (may be the same one twice). */
  readonly pairs: readonly (readonly PairCandidate[])[];
  readonly singles: readonly (readonly { readonly zero: number; readonly gain: number }[])[];
}

interface PairCandidate {
  readonly partner: number;
  readonly zeros: readonly [number, number];
  readonly gain: number;
}

function distinctZeros(zeros: readonly Complex[]): { value: Complex; members: number[] }[] {
  const groups: { value: Complex; members: number[] }[] = [];
  zeros.forEach((zero, index) => {
    const group = groups.find(({ value }) => value.sub(zero).abs() < SAME_ZERO);
    if (group) group.members.push(index);
    else groups.push({ value: zero, members: [index] });
  });
  return groups;
}

function tableOf(filter: TransferFunction): Table {
  const { poles } = filter;
  const zeros = distinctZeros(filter.zeros);
  const pairs = poles.map((first, i) => {
    const found: PairCandidate[] = [];
    for (let partner = i + 1; partner < poles.length; partner++) {
      zeros.forEach(({ value }, a) => {
        const { gain, otherZero } = cellOfNull([first, poles[partner]!], value);
        if (otherZero === null) return;
        for (let b = a; b < zeros.length; b++)
          if (zeros[b]!.value.sub(otherZero).abs() < SAME_ZERO) found.push({ partner, zeros: [a, b], gain });
      });
    }
    return found;
  });
  const singles = poles.map((pole) =>
    poles.length % 2 ? zeros.map(({ value }, zero) => ({ zero, gain: cellOfNull([pole], value).gain })) : [],
  );
  return { zeros, pairs, singles };
}

/** Every draft that pole `i` can lead or join with free poles and zeros. */
function draftsOf(table: Table, i: number, free: readonly boolean[], left: readonly number[]): Draft[] {
  const drafts: Draft[] = [];
  const fits = (groups: readonly number[]): boolean =>
    groups.every((group) => left[group]! >= groups.filter((other) => other === group).length);
  table.pairs.forEach((candidates, leader) => {
    for (const { partner, zeros, gain } of candidates) {
      if ((leader !== i && partner !== i) || !free[leader] || !free[partner] || !fits(zeros)) continue;
      drafts.push({ poles: [leader, partner], groups: zeros, gain });
    }
  });
  return drafts;
}

function take(draft: Draft, free: boolean[], left: number[], sign: 1 | -1): void {
  for (const pole of draft.poles) free[pole] = sign > 0;
  for (const group of draft.groups) left[group] = left[group]! + sign;
}

/** All complete pairings; the product of leading coefficients decides, since it is the constant in front of H. */
function enumerate(
  table: Table,
  poles: number,
): { best: Draft[]; considered: number; spreadDb: number } | null {
  const free = new Array<boolean>(poles).fill(true);
  const left = table.zeros.map(({ members }) => members.length);
  const chosen: Draft[] = [];
  let best: Draft[] | null = null;
  let most = 0;
  let least = Number.POSITIVE_INFINITY;
  let considered = 0;
  const visit = (gain: number, singleUsed: boolean): void => {
    const next = free.indexOf(true);
    if (next < 0) {
      considered += 1;
      least = Math.min(least, gain);
      if (gain > most) {
        most = gain;
        best = [...chosen];
      }
      return;
    }
    const singles = singleUsed
      ? []
      : table.singles[next]!.filter(({ zero }) => left[zero]! > 0).map((single) => ({
          poles: [next],
          groups: [single.zero],
          gain: single.gain,
        }));
    for (const draft of [...draftsOf(table, next, free, left), ...singles]) {
      take(draft, free, left, -1);
      chosen.push(draft);
      visit(gain * draft.gain, singleUsed || draft.poles.length === 1);
      chosen.pop();
      take(draft, free, left, 1);
    }
  };
  visit(1, poles % 2 === 0);
  return best === null ? null : { best, considered, spreadDb: 20 * Math.log10(most / least) };
}

/** Nearest the circle first, each with the nearest zeros; the pole that no other mirrors takes the zero left over. */
function nearestZeros(table: Table, filter: TransferFunction): Draft[] | null {
  const { poles } = filter;
  const free = poles.map(() => true);
  const left = table.zeros.map(({ members }) => members.length);
  const mirrored = poles.map((_, i) => draftsOf(table, i, free, left).length > 0);
  const byRadius = poles.map((_, i) => i).sort((a, b) => poles[b]!.abs() - poles[a]!.abs());
  const chosen: Draft[] = [];
  for (const i of byRadius) {
    if (!free[i] || !mirrored[i]) continue;
    const distance = (draft: Draft): number =>
      Math.min(...draft.groups.map((group) => table.zeros[group]!.value.sub(poles[i]!).abs()));
    const [draft] = draftsOf(table, i, free, left).sort((a, b) => distance(a) - distance(b));
    if (!draft) return null;
    take(draft, free, left, -1);
    chosen.push(draft);
  }
  const single = free.indexOf(true);
  if (single < 0) return chosen;
  const group = left.findIndex((count) => count > 0);
  const gain = table.singles[single]!.find(({ zero }) => zero === group)?.gain;
  if (free.filter(Boolean).length > 1 || gain === undefined) return null;
  return [...chosen, { poles: [single], groups: [group], gain }];
}

/** Draws the filter's own zero indices for the groups of each draft. */
function settle(table: Table, drafts: readonly Draft[]): SectionChoice[] {
  const stock = table.zeros.map(({ members }) => [...members]);
  return drafts.map(({ poles, groups, gain }) => ({
    poles,
    gain,
    zeros: groups.map((group) => stock[group]!.pop()!),
  }));
}

/**
 * Pairs poles with zeros so that the cascade of passive sections passes the most light. Zeros must lie on the circle.
 * Throws a Refusal where the filter does not come apart into such sections.
 */
export function pairPolesWithZeros(filter: TransferFunction): Pairing {
  const table = tableOf(filter);
  const small = filter.poles.length <= ENUMERATED_POLES;
  const found = small ? enumerate(table, filter.poles.length) : null;
  const drafts = found?.best ?? (small ? null : nearestZeros(table, filter));
  if (!drafts)
    throw new Refusal({
      code: 'SPECIFICATION_UNREACHABLE',
      limit: 'PASSIVITY',
      detail:
        'The filter does not come apart into second-order sections with their nulls on the unit circle.',
    });
  return {
    choices: settle(table, drafts),
    method: small ? 'ENUMERATED' : 'NEAREST_ZEROS',
    considered: found?.considered ?? 1,
    spreadDb: found?.spreadDb ?? 0,
  };
}
