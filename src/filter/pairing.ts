/**
 * Which poles and zeros share a second-order section.
 *
 * A pair is two roots that are mirror images about the filter's centre (conjugates, before rotation); roots that are
 * their own mirror image are joined two by two, and an odd one stands alone in a first-order section. The heuristic,
 * poles nearest to the unit circle first, each with the nearest zeros: L. B. Jackson, "Roundoff-noise analysis for
 * fixed-point digital filters realized in cascade or parallel form", IEEE Trans. Audio Electroacoust. 18, 107 (1970).
 */
import type { Complex } from 'complex.js';
import type { TransferFunction } from './transfer-function.ts';

/** Positions of a section's poles and zeros in the filter's lists; one or two of each, equally many. */
interface SectionRoots {
  readonly poles: readonly number[];
  readonly zeros: readonly number[];
}

export type Pairing = readonly SectionRoots[];

type Group = readonly number[];

const squaredDistance = (a: Complex, re: number, im: number): number => (a.re - re) ** 2 + (a.im - im) ** 2;

/** Position of the root that is nearest to the mirror image of root `index`; itself where it is its own image. */
function imageOf(roots: readonly Complex[], index: number, centreRad: number): number {
  const root = roots[index]!;
  const cos = Math.cos(2 * centreRad);
  const sin = Math.sin(2 * centreRad);
  const re = root.re * cos + root.im * sin;
  const im = root.re * sin - root.im * cos;
  let best = index;
  let distance = squaredDistance(root, re, im);
  roots.forEach((candidate, position) => {
    const here = squaredDistance(candidate, re, im);
    if (here >= distance) return;
    distance = here;
    best = position;
  });
  return best;
}

function mirrorPairs(roots: readonly Complex[], centreRad: number): Group[] {
  const groups: Group[] = [];
  const alone: number[] = [];
  const taken = new Set<number>();
  roots.forEach((_, index) => {
    if (taken.has(index)) return;
    const image = imageOf(roots, index, centreRad);
    if (image === index || taken.has(image)) {
      alone.push(index);
      return;
    }
    taken.add(index).add(image);
    groups.push([index, image]);
  });
  while (alone.length > 1) groups.push([alone.shift()!, alone.pop()!]);
  if (alone.length === 1) groups.push(alone);
  return groups;
}

/** Least distance between a pole of one group and a zero of the other. */
function groupDistance(filter: TransferFunction, poles: Group, zeros: Group): number {
  let least = Number.POSITIVE_INFINITY;
  for (const pole of poles) {
    for (const zero of zeros) {
      const root = filter.zeros[zero]!;
      least = Math.min(least, squaredDistance(filter.poles[pole]!, root.re, root.im));
    }
  }
  return least;
}

/** The pairing of the heuristic, for a filter whose response is symmetric about `centreRad`. O(order²). */
export function pairPoles(filter: TransferFunction, centreRad = 0): Pairing {
  const radius = (group: Group): number => Math.max(...group.map((pole) => filter.poles[pole]!.abs()));
  const poleGroups = mirrorPairs(filter.poles, centreRad).sort(
    (a, b) => b.length - a.length || radius(b) - radius(a),
  );
  const zeroGroups = mirrorPairs(filter.zeros, centreRad);
  return poleGroups.map((poles) => {
    const fitting = zeroGroups.filter((zeros) => zeros.length === poles.length);
    const zeros = fitting.reduce((best, candidate) =>
      groupDistance(filter, poles, candidate) < groupDistance(filter, poles, best) ? candidate : best,
    );
    zeroGroups.splice(zeroGroups.indexOf(zeros), 1);
    return { poles, zeros };
  });
}

function* arrangements<T>(items: readonly T[]): Generator<readonly T[]> {
  if (items.length < 2) {
    yield items;
    return;
  }
  for (let first = 0; first < items.length; first++) {
    for (const rest of arrangements(items.toSpliced(first, 1))) yield [items[first]!, ...rest];
  }
}

/** All ways to split positions into twos, with one left alone where their number is odd. */
function* matchings(positions: readonly number[]): Generator<readonly Group[]> {
  if (positions.length < 2) {
    yield positions.length === 0 ? [] : [positions];
    return;
  }
  const [first, ...others] = positions as [number, ...number[]];
  for (let partner = 0; partner < others.length; partner++) {
    for (const rest of matchings(others.toSpliced(partner, 1))) yield [[first, others[partner]!], ...rest];
  }
  if (positions.length % 2 === 0) return;
  for (const rest of matchings(others)) yield [...rest, [first]];
}

function* marry(poleGroups: readonly Group[], zeroGroups: readonly Group[]): Generator<Pairing> {
  const twos = zeroGroups.filter((group) => group.length === 2);
  const ones = zeroGroups.filter((group) => group.length === 1);
  const ordered = poleGroups.toSorted((a, b) => b.length - a.length);
  for (const arrangement of arrangements(twos)) {
    const zeros = [...arrangement, ...ones];
    yield ordered.map((poles, index) => ({ poles, zeros: zeros[index]! }));
  }
}

/** Every assignment of mirrored zero pairs to mirrored pole pairs: m! for m pairs. */
export function* mirroredPairings(filter: TransferFunction, centreRad = 0): Generator<Pairing> {
  yield* marry(mirrorPairs(filter.poles, centreRad), mirrorPairs(filter.zeros, centreRad));
}

/**
 * Every pairing at all, mirrored or not: sections with one broad and one narrow ring are among them and often lose
 * least. 18 of order 4, 1,350 of order 6, 264,600 of order 8: the caller stops where enough is enough.
 */
export function* allPairings(filter: TransferFunction): Generator<Pairing> {
  const poles = filter.poles.map((_, index) => index);
  const zeros = filter.zeros.map((_, index) => index);
  for (const poleGroups of matchings(poles)) {
    for (const zeroGroups of matchings(zeros)) yield* marry(poleGroups, zeroGroups);
  }
}
