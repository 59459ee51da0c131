/**
 * What an order can do. Every classical family is |H|² = 1/(1 + ε²·F²(w)), so two numbers decide: the selectivity
 * s = w_stop/w_pass > 1 of the prewarped edges and the discrimination D = ε_stop/ε_pass > 1. One determines the other:
 *
 * | family       | D                       | source |
 * |---|---|---|
 * | Butterworth  | s^N                     | Parks and Burrus 1987, section 7.2.1 |
 * | Chebyshev    | cosh(N·acosh s)         | the same, sections 7.2.2 and 7.2.3 |
 * | elliptic     | degree equation         | Orfanidis 2006, N·K'/K = K₁'/K₁ with k = 1/s, k₁ = 1/D |
 *
 * Both numbers are carried as their excess over 1, since edges may be as close as one likes.
 */
import { discriminationModulus, logNome, type Modulus, selectivityModulus } from './elliptic.ts';
import type { Family } from './specification.ts';

/** acosh(1 + x) without taking 1 + x. */
const acoshFromExcess = (x: number): number => Math.log1p(x + Math.sqrt(x * (2 + x)));

/** cosh(y) − 1 = 2·sinh²(y/2). */
const coshExcess = (y: number): number => 2 * Math.sinh(y / 2) ** 2;

/** Modulus 1/(1 + x) with its complement √(x·(2 + x))/(1 + x). */
const modulusFromExcess = (x: number): Modulus => ({
  k: 1 / (1 + x),
  complement: Math.sqrt(x * (2 + x)) / (1 + x),
});

/** 1/k − 1 = k'²/(k·(1 + k)). */
export const excessOfModulus = ({ k, complement }: Modulus): number =>
  (complement * complement) / (k * (1 + k));

/** D − 1 of an order at a selectivity excess s − 1. */
export function discriminationExcess(family: Family, order: number, selectivityExcess: number): number {
  if (family === 'BUTTERWORTH') return Math.expm1(order * Math.log1p(selectivityExcess));
  if (family === 'ELLIPTIC') {
    return excessOfModulus(discriminationModulus(order, modulusFromExcess(selectivityExcess)));
  }
  return coshExcess(order * acoshFromExcess(selectivityExcess));
}

/** s − 1 that an order needs for a discrimination excess D − 1. */
export function selectivityExcess(family: Family, order: number, discriminationExcess: number): number {
  if (family === 'BUTTERWORTH') return Math.expm1(Math.log1p(discriminationExcess) / order);
  if (family === 'ELLIPTIC') {
    return excessOfModulus(selectivityModulus(order, modulusFromExcess(discriminationExcess)));
  }
  return coshExcess(acoshFromExcess(discriminationExcess) / order);
}

/** The order, not rounded, that joins both. */
export function orderBetween(
  family: Family,
  selectivityExcess: number,
  discriminationExcess: number,
): number {
  if (family === 'BUTTERWORTH') return Math.log1p(discriminationExcess) / Math.log1p(selectivityExcess);
  if (family === 'ELLIPTIC') {
    return logNome(modulusFromExcess(discriminationExcess)) / logNome(modulusFromExcess(selectivityExcess));
  }
  return acoshFromExcess(discriminationExcess) / acoshFromExcess(selectivityExcess);
}

/** An order that exceeds a whole number by less than this, relative, does so by the rounding of the demand. */
const ORDER_SLACK = 1e-9;

/** The least whole order that is enough. */
export const wholeOrder = (exactOrder: number): number =>
  Math.max(1, Math.ceil(exactOrder * (1 - ORDER_SLACK)));
