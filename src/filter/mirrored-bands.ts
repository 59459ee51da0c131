/**
 * Band-pass and band-stop with real coefficients, as digital signal processing knows them: two bands mirrored about
 * Ω = 0 and 2N poles from a prototype of order N. A single optical band is a rotated low- or high-pass of N rings
 * instead (`rotateFilter`); these are for the two bands that lie symmetrically about the reference frequency.
 *
 * Lowpass-to-bandpass s → (s² + w₀²)/(B·s), w₀² = w₁w₂, B = w₂ − w₁, and its inverse for the band-stop (Parks and
 * Burrus 1987, chapter 7). The map keeps the imaginary axis, so an all-pass arm stays one: both poles that come from
 * a pole inherit its label.
 */
import { Complex } from 'complex.js';
import { Refusal } from '../errors.ts';
import { bilinear, prewarp } from './bilinear.ts';
import { type AnalogFilter, analogPrototype, type PrototypeAsk } from './families.ts';
import { guardEdge, guardPrototype } from './guards.ts';
import type { LabelledFilter } from './transfer-function.ts';

/** The design edges of the band at positive Ω, 0 < low < high < π. */
export interface MirroredBandAsk extends PrototypeAsk {
  readonly lowEdgeRad: number;
  readonly highEdgeRad: number;
}

/** Roots of s² − 2·half·s + w₀²: the greater first, the other by their product, so that neither cancels. */
function splitRoot(half: Complex, centreSquared: number): [Complex, Complex] {
  if (half.re === 0) {
    const greater = half.im + (half.im < 0 ? -1 : 1) * Math.sqrt(half.im * half.im + centreSquared);
    return [new Complex(0, greater), new Complex(0, -centreSquared / greater)];
  }
  const root = half.mul(half).sub(centreSquared).sqrt();
  const plus = half.add(root);
  const minus = half.sub(root);
  const greater = plus.abs() >= minus.abs() ? plus : minus;
  return [greater, greater.inverse().mul(centreSquared)];
}

function analogBand(ask: MirroredBandAsk, pass: boolean): AnalogFilter {
  const low = prewarp(ask.lowEdgeRad);
  const high = prewarp(ask.highEdgeRad);
  const width = high - low;
  const centreSquared = low * high;
  const prototype = analogPrototype(ask);
  const spread = (root: Complex): [Complex, Complex] => {
    const onAxis = root.re === 0;
    const passHalf = onAxis ? new Complex(0, (width * root.im) / 2) : root.mul(width / 2);
    const stopHalf = onAxis ? new Complex(0, -width / (2 * root.im)) : root.inverse().mul(width / 2);
    return splitRoot(pass ? passHalf : stopHalf, centreSquared);
  };
  const poles = prototype.poles.flatMap(spread);
  const zeros = prototype.zeros.flatMap(spread);
  const atInfinity = prototype.poles.length - prototype.zeros.length;
  const centre = Math.sqrt(centreSquared);
  for (let count = 0; count < atInfinity; count++) {
    if (pass) zeros.push(new Complex(0, 0));
    else zeros.push(new Complex(0, centre), new Complex(0, -centre));
  }
  const gain = pass ? prototype.gain * width ** atInfinity : prototype.dcGain;
  return { zeros, poles, gain, arms: prototype.arms.flatMap((arm) => [arm, arm]) };
}

function guardMirrored(ask: MirroredBandAsk): void {
  guardPrototype(ask);
  guardEdge(ask.lowEdgeRad);
  guardEdge(ask.highEdgeRad);
  if (ask.lowEdgeRad < ask.highEdgeRad) return;
  throw new Refusal({
    code: 'SPECIFICATION_INVALID',
    detail: 'The lower edge of a band must lie below its upper edge.',
    given: [ask.lowEdgeRad, ask.highEdgeRad],
  });
}

/** Passes both bands low ≤ |Ω| ≤ high; 2·order poles. */
export function designMirroredBandPass(ask: MirroredBandAsk): LabelledFilter {
  guardMirrored(ask);
  return bilinear(analogBand(ask, true));
}

/** Stops both bands low ≤ |Ω| ≤ high; 2·order poles. */
export function designMirroredBandStop(ask: MirroredBandAsk): LabelledFilter {
  guardMirrored(ask);
  return bilinear(analogBand(ask, false));
}
