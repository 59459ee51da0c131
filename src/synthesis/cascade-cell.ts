/**
 * One cell at one Ω: transmission in dB and its gradient in [u, φ] of every ring, ψ, and β_in, β_out where free. The hot
 * loop of the mask optimiser; scratch is allocated once.
 */
import type { OutputPort } from '../filter/index.ts';

/** Power below which a null is not followed further: 10·log10 of it is −300 dB. */
const POWER_FLOOR = 1e-30;

const DB_PER_NEPER = 20 / Math.LN10;

export interface RingPlan {
  readonly amplitude: number;
  /** e^(−jΩ·delay) on the grid. */
  readonly re: Float64Array;
  readonly im: Float64Array;
}

export interface CellPlan {
  readonly first: number;
  readonly rings: readonly (readonly RingPlan[])[];
  readonly arms: readonly RingPlan[];
  readonly couplerAmplitude: number;
  readonly output: OutputPort;
  readonly betaIn: number;
  readonly betaOut: number;
}

/** What one cell needs between points and rings; `[arm]` of fields, per ring of an arm. */
export interface Scratch {
  readonly ringRe: readonly Float64Array[];
  readonly ringIm: readonly Float64Array[];
  /** dR/du and dR/dφ. */
  readonly byDepthRe: readonly Float64Array[];
  readonly byDepthIm: readonly Float64Array[];
  readonly byPhaseRe: readonly Float64Array[];
  readonly byPhaseIm: readonly Float64Array[];
  readonly t: readonly Float64Array[];
  readonly coupling: readonly Float64Array[];
  readonly turnRe: readonly Float64Array[];
  readonly turnIm: readonly Float64Array[];
  readonly armRe: Float64Array;
  readonly armIm: Float64Array;
  /** Plain factor of each arm (delay, phase, loss). */
  readonly plainRe: Float64Array;
  readonly plainIm: Float64Array;
  /** Weight of each arm at the output, and its derivatives by β_in and β_out. */
  readonly weight: Float64Array;
  readonly weightByIn: Float64Array;
  readonly weightByOut: Float64Array;
  readonly armTurn: Float64Array;
}

export function createScratch(widest: number): Scratch {
  const two = (): readonly Float64Array[] => [new Float64Array(widest), new Float64Array(widest)];
  const pair = (): Float64Array => new Float64Array(2);
  return {
    ringRe: two(),
    ringIm: two(),
    byDepthRe: two(),
    byDepthIm: two(),
    byPhaseRe: two(),
    byPhaseIm: two(),
    t: two(),
    coupling: two(),
    turnRe: two(),
    turnIm: two(),
    armRe: pair(),
    armIm: pair(),
    plainRe: pair(),
    plainIm: pair(),
    weight: pair(),
    weightByIn: pair(),
    weightByOut: pair(),
    armTurn: pair(),
  };
}

/** Everything of a cell that does not depend on Ω. */
export function loadCell(plan: CellPlan, given: Float64Array, s: Scratch, freeCouplers: boolean): void {
  let at = plan.first;
  for (let arm = 0; arm < 2; arm++) {
    const rings = plan.rings[arm]!;
    for (let k = 0; k < rings.length; k++) {
      const sech = 1 / Math.cosh(given[at]!);
      s.t[arm]![k] = Math.tanh(given[at]!);
      s.coupling[arm]![k] = sech * sech;
      s.turnRe[arm]![k] = rings[k]!.amplitude * Math.cos(given[at + 1]!);
      s.turnIm[arm]![k] = -rings[k]!.amplitude * Math.sin(given[at + 1]!);
      at += 2;
    }
  }
  s.armTurn[0] = Math.cos(given[at]!);
  s.armTurn[1] = -Math.sin(given[at]!);
  const betaIn = freeCouplers ? given[at + 1]! : plan.betaIn;
  const betaOut = freeCouplers ? given[at + 2]! : plan.betaOut;
  const g2 = plan.couplerAmplitude * plan.couplerAmplitude;
  const cIn = Math.cos(betaIn);
  const sIn = Math.sin(betaIn);
  const cOut = Math.cos(betaOut);
  const sOut = Math.sin(betaOut);
  // OUT1: cc·A₀ − ss·A₁; OUT2 (without its −j, which has no power): cs·A₀ + sc·A₁.
  const bar = plan.output === 'OUT1';
  s.weight[0] = g2 * cIn * (bar ? cOut : sOut);
  s.weight[1] = g2 * sIn * (bar ? -sOut : cOut);
  s.weightByIn[0] = -g2 * sIn * (bar ? cOut : sOut);
  s.weightByIn[1] = g2 * cIn * (bar ? -sOut : cOut);
  s.weightByOut[0] = g2 * cIn * (bar ? -sOut : cOut);
  s.weightByOut[1] = g2 * sIn * (bar ? -cOut : -sOut);
}

/** Ring fields and derivatives of one arm at a point; the arm's field from them. */
function armInto(plan: CellPlan, arm: number, point: number, s: Scratch, derivatives: boolean): void {
  const g = plan.couplerAmplitude;
  const rings = plan.rings[arm]!;
  const plain = plan.arms[arm]!;
  const p = plain.re[point]! * plain.amplitude;
  const q = plain.im[point]! * plain.amplitude;
  const turnRe = arm === 0 ? 1 : s.armTurn[0]!;
  const turnIm = arm === 0 ? 0 : s.armTurn[1]!;
  let re = p * turnRe - q * turnIm;
  let im = p * turnIm + q * turnRe;
  s.plainRe[arm] = re;
  s.plainIm[arm] = im;
  for (let k = 0; k < rings.length; k++) {
    const t = s.t[arm]![k]!;
    const unitRe = rings[k]!.re[point]!;
    const unitIm = rings[k]!.im[point]!;
    const xRe = g * (s.turnRe[arm]![k]! * unitRe - s.turnIm[arm]![k]! * unitIm);
    const xIm = g * (s.turnRe[arm]![k]! * unitIm + s.turnIm[arm]![k]! * unitRe);
    // R = g(t − gx)/(1 − gtx) with gx in x.
    const dRe = 1 - t * xRe;
    const dIm = -t * xIm;
    const inverse = 1 / (dRe * dRe + dIm * dIm);
    const iRe = dRe * inverse;
    const iIm = -dIm * inverse;
    const rRe = g * ((t - xRe) * iRe + xIm * iIm);
    const rIm = g * ((t - xRe) * iIm - xIm * iRe);
    s.ringRe[arm]![k] = rRe;
    s.ringIm[arm]![k] = rIm;
    if (derivatives) {
      const coupling = s.coupling[arm]![k]! * g;
      const sqRe = iRe * iRe - iIm * iIm;
      const sqIm = 2 * iRe * iIm;
      const oneRe = 1 - (xRe * xRe - xIm * xIm);
      const oneIm = -2 * xRe * xIm;
      s.byDepthRe[arm]![k] = coupling * (oneRe * sqRe - oneIm * sqIm);
      s.byDepthIm[arm]![k] = coupling * (oneRe * sqIm + oneIm * sqRe);
      s.byPhaseRe[arm]![k] = -coupling * (xRe * sqIm + xIm * sqRe);
      s.byPhaseIm[arm]![k] = coupling * (xRe * sqRe - xIm * sqIm);
    }
    const next = re * rRe - im * rIm;
    im = re * rIm + im * rRe;
    re = next;
  }
  s.armRe[arm] = re;
  s.armIm[arm] = im;
}

/** Adds one cell's dB at one point and writes its part of that point's Jacobian row. */
export function cellInto(
  plan: CellPlan,
  point: number,
  s: Scratch,
  powerDb: Float64Array,
  jacobian: Float64Array | null,
  width: number,
  freeCouplers: boolean,
): void {
  armInto(plan, 0, point, s, jacobian !== null);
  armInto(plan, 1, point, s, jacobian !== null);
  const re = s.weight[0]! * s.armRe[0]! + s.weight[1]! * s.armRe[1]!;
  const im = s.weight[0]! * s.armIm[0]! + s.weight[1]! * s.armIm[1]!;
  const power = re * re + im * im + POWER_FLOOR;
  powerDb[point] = powerDb[point]! + 10 * Math.log10(power);
  if (jacobian === null) return;
  // d(dB) = 20/ln10 · Re(conj(X)·dX)/|X|²; (fRe, fIm) is conj(X) with the factors in.
  const fRe = (DB_PER_NEPER * re) / power;
  const fIm = (-DB_PER_NEPER * im) / power;
  let column = point * width + plan.first;
  for (let arm = 0; arm < 2; arm++) {
    const count = plan.rings[arm]!.length;
    for (let k = 0; k < count; k++) {
      let restRe = s.plainRe[arm]! * s.weight[arm]!;
      let restIm = s.plainIm[arm]! * s.weight[arm]!;
      for (let other = 0; other < count; other++) {
        if (other === k) continue;
        const oRe = s.ringRe[arm]![other]!;
        const oIm = s.ringIm[arm]![other]!;
        const next = restRe * oRe - restIm * oIm;
        restIm = restRe * oIm + restIm * oRe;
        restRe = next;
      }
      const hRe = fRe * restRe - fIm * restIm;
      const hIm = fRe * restIm + fIm * restRe;
      jacobian[column] = hRe * s.byDepthRe[arm]![k]! - hIm * s.byDepthIm[arm]![k]!;
      jacobian[column + 1] = hRe * s.byPhaseRe[arm]![k]! - hIm * s.byPhaseIm[arm]![k]!;
      column += 2;
    }
  }
  // dA₁/dψ = −j·A₁.
  jacobian[column] = s.weight[1]! * (fRe * s.armIm[1]! + fIm * s.armRe[1]!);
  if (!freeCouplers) return;
  for (let end = 0; end < 2; end++) {
    const by = end === 0 ? s.weightByIn : s.weightByOut;
    const bRe = by[0]! * s.armRe[0]! + by[1]! * s.armRe[1]!;
    const bIm = by[0]! * s.armIm[0]! + by[1]! * s.armIm[1]!;
    jacobian[column + 1 + end] = fRe * bRe - fIm * bIm;
  }
}
