/**
 * Where the joint optimisation starts: every way to put the filter's poles in pairs, mirrored or not, with every choice
 * of one null a cell. The best cascades pair one broad with one narrow ring of opposite sign, which no exact section does.
 */
import type { Complex } from 'complex.js';
import type { InterferometerParameters } from '../circuit/index.ts';
import type { OutputPort, TransferFunction } from '../filter/index.ts';
import { cellWithNull } from './section.ts';

/** More combinations than this are sampled: a start costs one evaluation to judge, and near ones repeat each other. */
const MOST_STARTS = 1500;

/** (N−1)!! pairings: 105 at eight poles; beyond, that many or so are drawn. */
const ENUMERATED_POLES = 8;
const DRAWN_PAIRINGS = 150;

/** Zeros nearer than this are one. */
const SAME_ZERO = 1e-7;

export interface CascadeStart {
  readonly pairing: number;
  readonly cells: readonly InterferometerParameters[];
}

/** All ways to put 0…count−1 in pairs, one left single where count is odd. */
function pairings(count: number): number[][][] {
  const visit = (free: readonly number[]): number[][][] => {
    const [first, ...rest] = free;
    if (first === undefined) return [[]];
    const paired = rest.flatMap((partner) =>
      visit(rest.filter((other) => other !== partner)).map((tail) => [[first, partner], ...tail]),
    );
    const single = free.length % 2 === 1 ? visit(rest).map((tail) => [[first], ...tail]) : [];
    return [...paired, ...single];
  };
  return visit(Array.from({ length: count }, (_, k) => k));
}

/**
 * Uniform numbers in [0, 1) from a seed. Source: G. Steele, D. Lea, C. Flood, "Fast splittable pseudorandom number
 * generators", OOPSLA 2014 (the 32-bit variant of its mixing step; from memory).
 */
function seededUniform(seed: number): () => number {
  let state = seed >>> 0;
  return () => {
    state = (state + 0x9e3779b9) >>> 0;
    let mixed = Math.imul(state ^ (state >>> 16), 0x85ebca6b);
    mixed = Math.imul(mixed ^ (mixed >>> 13), 0xc2b2ae35);
    return ((mixed ^ (mixed >>> 16)) >>> 0) / 2 ** 32;
  };
}

/** A pairing drawn at random: neighbours of a shuffled list (R. Durstenfeld, Comm. ACM 7, 420 (1964)). */
function drawnPairing(count: number, uniform: () => number): number[][] {
  const shuffled = Array.from({ length: count }, (_, k) => k);
  for (let k = count - 1; k > 0; k--) {
    const other = Math.floor(uniform() * (k + 1));
    [shuffled[k], shuffled[other]] = [shuffled[other]!, shuffled[k]!];
  }
  return Array.from({ length: Math.ceil(count / 2) }, (_, k) => shuffled.slice(2 * k, 2 * k + 2));
}

function distinct(zeros: readonly Complex[]): Complex[] {
  return zeros.filter((zero, k) => zeros.findIndex((other) => other.sub(zero).abs() < SAME_ZERO) === k);
}

/** Every start up to eight poles where they are few enough, else a seeded sample of them; deterministic. */
export function cascadeStarts(
  filter: TransferFunction,
  outputs: readonly OutputPort[],
  seed: number,
): CascadeStart[] {
  const { poles } = filter;
  const zeros = distinct(filter.zeros);
  const uniform = seededUniform(seed);
  const all =
    poles.length <= ENUMERATED_POLES
      ? pairings(poles.length)
      : Array.from({ length: DRAWN_PAIRINGS }, () => drawnPairing(poles.length, uniform));
  const choices = zeros.length ** outputs.length;
  const start = (pairing: number, choice: number): CascadeStart => {
    let rest = choice;
    const cells = all[pairing]!.map((members, cell) => {
      const zero = zeros[rest % zeros.length]!;
      rest = Math.floor(rest / zeros.length);
      return cellWithNull(
        members.map((k) => poles[k]!),
        zero,
        outputs[cell]!,
      );
    });
    return { pairing, cells };
  };
  const total = all.length * choices;
  if (total <= MOST_STARTS)
    return Array.from({ length: total }, (_, k) => start(Math.floor(k / choices), k % choices));
  return Array.from({ length: MOST_STARTS }, (_, k) =>
    start(k % all.length, Math.floor(uniform() * choices)),
  );
}
