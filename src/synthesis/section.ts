/**
 * First- and second-order sections as cells. Two rings of poles p₁, p₂ in the two arms and one arm phase:
 *
 *   X = ½(R₁ + s·R₂),  R = (t − c·z⁻¹)/(1 − p·z⁻¹),  c = e^(−jφ), p = t·c,  s = −e^(−jψ) on OUT1, e^(−jψ) on OUT2 (times −j)
 *   numerator  b₀ = t₁ + s·t₂,  b₁ = −(c₁ + t₁p₂) − s·(c₂ + t₂p₁),  b₂ = c₁c₂·(t₂ + s·t₁)
 *
 * A null asked at z₀ on the circle fixes s = −R₁(z₀)/R₂(z₀); the other zero is then b₂/(b₀·z₀). Of poles that mirror each
 * other about a centre it is the mirror image of z₀: closed form, no fit. With losses and free couplers the same algebra
 * holds with weighted arms. One ring against a plain arm gives the first-order section; its zero is on the circle for
 * every arm phase.
 * Source: the two-path form of P. A. Regalia, S. K. Mitra, P. P. Vaidyanathan, "The digital all-pass filter: a versatile
 * signal processing building block", Proc. IEEE 76, 19 (1988), multiplied out.
 */
import { Complex } from 'complex.js';
import type { InterferometerParameters, RingParameters } from '../circuit/index.ts';
import type { FilterSection, OutputPort, TransferFunction } from '../filter/index.ts';
import { balancedInterferometer } from './interferometer.ts';
import { greatestOnCircle } from './peak.ts';
import { armPhaseForNull, onCircle, ringOfPole } from './ring.ts';

const ONE = new Complex(1, 0);

/** b₀ smaller than this against the other coefficients is a zero at infinity. */
const VANISHES = 1e-15;

/** The lossless cell with one pole (a plain arm 1) or two and a null of `output` at the angle of `zero`. */
export function cellWithNull(
  poles: readonly Complex[],
  zero: Complex,
  output: OutputPort,
): InterferometerParameters {
  const rings = poles.map(ringOfPole);
  const arms: [RingParameters[], RingParameters[]] = [rings.slice(0, 1), rings.slice(1)];
  return balancedInterferometer(arms, armPhaseForNull(arms, output, zero.arg()));
}

/** One arm as numerator n₀ + n₁z⁻¹ over 1 − p·z⁻¹, and its weight at the output. */
interface ArmFactors {
  readonly weight: Complex;
  readonly n0: Complex;
  readonly n1: Complex;
  readonly pole: Complex | null;
}

function armFactors(cell: InterferometerParameters, arm: 0 | 1, weight: Complex): ArmFactors {
  const { rings, delay, phaseRad, lossDb } = cell.arms[arm];
  const ring = rings[0];
  if (rings.length > 1 || delay !== 0 || (ring && ring.delay !== 1))
    throw new RangeError('A section has at most one unit-delay ring an arm and arms without plain delay.');
  const plain = weight.mul(onCircle(-phaseRad).mul(10 ** (-lossDb / 20)));
  if (!ring) return { weight: plain, n0: ONE, n1: new Complex(0, 0), pole: null };
  const g = 10 ** (-cell.couplerExcessLossDb / 20);
  const t = Math.sqrt(1 - ring.powerCrossCoupling);
  const turn = onCircle(-ring.phaseRad).mul(g * 10 ** (-ring.lossDb / 20));
  return { weight: plain, n0: new Complex(g * t, 0), n1: turn.mul(-g), pole: turn.mul(t) };
}

/** Weights of the two arms at an output: coupler amplitudes and the −j of every crossing. */
function armWeights(cell: InterferometerParameters, output: OutputPort): [Complex, Complex] {
  const g2 = 10 ** (-cell.couplerExcessLossDb / 10);
  const cIn = Math.sqrt(1 - cell.inputCoupling);
  const sIn = Math.sqrt(cell.inputCoupling);
  const cOut = Math.sqrt(1 - cell.outputCoupling);
  const sOut = Math.sqrt(cell.outputCoupling);
  return output === 'OUT1'
    ? [new Complex(g2 * cIn * cOut, 0), new Complex(-g2 * sIn * sOut, 0)]
    : [new Complex(0, -g2 * cIn * sOut), new Complex(0, -g2 * sIn * cOut)];
}

/** Roots of b₀z² + b₁z + b₂ (or b₀z + b₁), without cancellation; roots at infinity are left out. */
function rootsOf(b: readonly Complex[]): Complex[] {
  const size = Math.max(...b.map((value) => value.abs()));
  const [b0, b1, b2] = b as [Complex, Complex, Complex | undefined];
  if (!b2) return b0.abs() <= VANISHES * size ? [] : [b1.neg().div(b0)];
  const root = b1.mul(b1).sub(b0.mul(b2).mul(4)).sqrt();
  const plus = b1.add(root);
  const minus = b1.sub(root);
  const q = (plus.abs() >= minus.abs() ? plus : minus).mul(-0.5);
  const zeros = b0.abs() <= VANISHES * size ? [] : [q.div(b0)];
  if (q.abs() > 0) zeros.push(b2.div(q));
  else if (zeros.length > 0) zeros.push(zeros[0]!);
  return zeros;
}

/** Numerator of the output in descending powers of z, and its poles. */
function numeratorOf(
  cell: InterferometerParameters,
  output: OutputPort,
): { b: Complex[]; poles: Complex[]; field: (omegaRad: number) => Complex } {
  const weights = armWeights(cell, output);
  const upper = armFactors(cell, 0, weights[0]);
  const lower = armFactors(cell, 1, weights[1]);
  const zero = new Complex(0, 0);
  const p0 = upper.pole ?? zero;
  const p1 = lower.pole ?? zero;
  const u = upper.weight;
  const v = lower.weight;
  const b = [
    u.mul(upper.n0).add(v.mul(lower.n0)),
    u.mul(upper.n1.sub(upper.n0.mul(p1))).add(v.mul(lower.n1.sub(lower.n0.mul(p0)))),
    u
      .mul(upper.n1.mul(p1))
      .add(v.mul(lower.n1.mul(p0)))
      .neg(),
  ];
  const poles = [upper.pole, lower.pole].filter((pole): pole is Complex => pole !== null);
  const arm = (factors: ArmFactors, inverse: Complex): Complex =>
    factors.weight
      .mul(factors.n0.add(factors.n1.mul(inverse)))
      .div(ONE.sub((factors.pole ?? zero).mul(inverse)));
  return {
    b: b.slice(0, poles.length + 1),
    poles,
    field: (omegaRad) => {
      const inverse = onCircle(-omegaRad);
      return arm(upper, inverse).add(arm(lower, inverse));
    },
  };
}

/** Π(z − zeros)/Π(z − poles) at e^(jΩ). */
function shapeAt(zeros: readonly Complex[], poles: readonly Complex[], omegaRad: number): Complex {
  const z = onCircle(omegaRad);
  let shape = ONE;
  for (const zero of zeros) shape = shape.mul(z.sub(zero));
  for (const pole of poles) shape = shape.div(z.sub(pole));
  return shape;
}

/**
 * What a cell does at `output`, as zeros, poles and gain, its losses and couplers included. `known` zeros are taken as
 * they are (a filter's own, exact where a double zero would lose half its digits as a root). The gain is matched where
 * the transmission is greatest, so the error there is a few ulp. Throws RangeError for a cell that is no section.
 */
export function sectionOf(
  cell: InterferometerParameters,
  output: OutputPort,
  known?: readonly Complex[],
): FilterSection {
  const { b, poles, field } = numeratorOf(cell, output);
  if (poles.length === 0) throw new RangeError('A cell without rings is no section.');
  const zeros = known ?? rootsOf(b);
  const shape: TransferFunction = { zeros, poles, gain: ONE };
  const peak = greatestOnCircle(poles, (omegaRad) => field(omegaRad).abs());
  const gain = field(peak.omegaRad).div(shapeAt(shape.zeros, poles, peak.omegaRad));
  return { zeros, poles, gain, peakDb: 20 * Math.log10(peak.value) };
}

/**
 * Of the lossless cell with a null at `zero` on the circle: the size of its leading coefficient, and the other zero of a
 * two-pole cell (null for one pole, or where it is at infinity).
 */
export function cellOfNull(
  poles: readonly Complex[],
  zero: Complex,
): { gain: number; otherZero: Complex | null } {
  const { b } = numeratorOf(cellWithNull(poles, zero, 'OUT2'), 'OUT2');
  const gain = b[0]!.abs();
  const last = b[2];
  return { gain, otherZero: last === undefined || gain <= VANISHES ? null : last.div(b[0]!.mul(zero)) };
}
