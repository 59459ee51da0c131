/**
 * Digital designs of the classical families: low-pass, high-pass, and either of them rotated to any centre. Labels of
 * the prototype's poles are carried through. Peak transmission is 1; the field at the middle of the passband is
 * positive (at the bottom of the ripple for even Chebyshev I and elliptic designs).
 */
import { Complex } from 'complex.js';
import { bilinear, prewarp } from './bilinear.ts';
import { type AnalogFilter, type AnalogPrototype, analogPrototype, type PrototypeAsk } from './families.ts';
import { guardEdge, guardPrototype } from './guards.ts';
import type { LabelledFilter } from './transfer-function.ts';

/** `edgeRad`: the family's design edge Ω in (0, π). */
export interface BandAsk extends PrototypeAsk {
  readonly edgeRad: number;
}

/** s → s/w. The gain of a factor ratio of degree d scales by w^d. */
export function scaleEdge(filter: AnalogPrototype, w: number): AnalogFilter {
  const scale = (root: Complex): Complex => root.mul(w);
  const gain = filter.gain * w ** (filter.poles.length - filter.zeros.length);
  return { zeros: filter.zeros.map(scale), poles: filter.poles.map(scale), gain, arms: filter.arms };
}

/** s → w/s. Zeros at infinity come to 0; the gain at infinity is what it was at 0. */
function invertEdge(filter: AnalogPrototype, w: number): AnalogFilter {
  const invert = (root: Complex): Complex =>
    root.re === 0 ? new Complex(0, -w / root.im) : root.inverse().mul(w);
  const zeros = filter.zeros.map(invert);
  while (zeros.length < filter.poles.length) zeros.push(new Complex(0, 0));
  return { zeros, poles: filter.poles.map(invert), gain: filter.dcGain, arms: filter.arms };
}

/** Passes |Ω| up to the design edge. */
export function designLowPass(ask: BandAsk): LabelledFilter {
  guardPrototype(ask);
  guardEdge(ask.edgeRad);
  return bilinear(scaleEdge(analogPrototype(ask), prewarp(ask.edgeRad)));
}

/** Passes from the design edge through Ω = π. */
export function designHighPass(ask: BandAsk): LabelledFilter {
  guardPrototype(ask);
  guardEdge(ask.edgeRad);
  return bilinear(invertEdge(analogPrototype(ask), prewarp(ask.edgeRad)));
}

/** The response at Ω becomes the one that was at Ω − centre. Magnitudes are exact; so is the phase, up to rounding. */
export function rotateFilter(filter: LabelledFilter, centreRad: number): LabelledFilter {
  const turn = new Complex(Math.cos(centreRad), Math.sin(centreRad));
  const rotate = (root: Complex): Complex => root.mul(turn);
  const excess = (filter.poles.length - filter.zeros.length) * centreRad;
  return {
    zeros: filter.zeros.map(rotate),
    poles: filter.poles.map(rotate),
    gain: excess === 0 ? filter.gain : filter.gain.mul(new Complex(Math.cos(excess), Math.sin(excess))),
    arms: filter.arms,
  };
}
