/**
 * One frequency at a time, without tables: the form that is exact next to a resonance, with the first two derivatives.
 *
 * A ring's derivatives, with B its denominator (src/circuit/elements.ts) and δ its delay:
 *   dr/dΩ = jδ·g·KA/B²,   d²r/dΩ² = δ²·g·KA·[(1 + tA)·cos(d/2) + j(1 − tA)·sin(d/2)]/B³
 * (by differentiating the closed form; checked against finite differences in the tests). They are multiplied through
 * the circuit by the product rule, never as logarithms, so that a field that vanishes does no harm.
 */
import { ARM_CONSTANT, CELL_CONSTANT, CELL_STRIDE, type Compiled, UNCOUPLED } from './compiled.ts';
import { RING_CONSTANT, RING_STRIDE } from './elements.ts';

/** A complex value with its first and second derivative by Ω: re, im, re′, im′, re″, im″. */
export type Jet = Float64Array;

export interface PointWorkspace {
  readonly out1: Jet;
  readonly out2: Jet;
  readonly in1: Jet;
  readonly in2: Jet;
  readonly arm0: Jet;
  readonly arm1: Jet;
  readonly factor: Jet;
}

export function createPointWorkspace(): PointWorkspace {
  const jet = () => new Float64Array(6);
  return { out1: jet(), out2: jet(), in1: jet(), in2: jet(), arm0: jet(), arm1: jet(), factor: jet() };
}

/** a ← a·b by the product rule. */
function multiplyJet(a: Jet, b: Jet): void {
  const a0r = a[0]!;
  const a0i = a[1]!;
  const a1r = a[2]!;
  const a1i = a[3]!;
  const b0r = b[0]!;
  const b0i = b[1]!;
  const b1r = b[2]!;
  const b1i = b[3]!;
  const a2r = a[4]!;
  const a2i = a[5]!;
  a[0] = a0r * b0r - a0i * b0i;
  a[1] = a0r * b0i + a0i * b0r;
  a[2] = a0r * b1r - a0i * b1i + (a1r * b0r - a1i * b0i);
  a[3] = a0r * b1i + a0i * b1r + (a1r * b0i + a1i * b0r);
  a[4] = a0r * b[4]! - a0i * b[5]! + 2 * (a1r * b1r - a1i * b1i) + (a2r * b0r - a2i * b0i);
  a[5] = a0r * b[5]! + a0i * b[4]! + 2 * (a1r * b1i + a1i * b1r) + (a2r * b0i + a2i * b0r);
}

/** The jet of a ring without its coupler's amplitude g, which the arm's amplitude holds. */
function ringJetInto(out: Jet, constants: Float64Array, at: number, omegaRad: number): void {
  const delay = constants[at + RING_CONSTANT.delay]!;
  const half = (delay * omegaRad + constants[at + RING_CONSTANT.phaseRad]!) / 2;
  const cos = Math.cos(half);
  const sin = Math.sin(half);
  const nRe = constants[at + RING_CONSTANT.numeratorCos]! * cos;
  const nIm = constants[at + RING_CONSTANT.numeratorSin]! * sin;
  const narrow = constants[at + RING_CONSTANT.denominatorCos]!;
  const wide = constants[at + RING_CONSTANT.denominatorSin]!;
  const dRe = narrow * cos;
  const dIm = wide * sin;
  const norm = 1 / (dRe * dRe + dIm * dIm);
  out[0] = (nRe * dRe + nIm * dIm) * norm;
  out[1] = (nIm * dRe - nRe * dIm) * norm;
  // 1/B, 1/B², 1/B³
  const iRe = dRe * norm;
  const iIm = -dIm * norm;
  const sqRe = iRe * iRe - iIm * iIm;
  const sqIm = 2 * iRe * iIm;
  const slope = delay * constants[at + RING_CONSTANT.slope]!;
  out[2] = -slope * sqIm;
  out[3] = slope * sqRe;
  const cubeRe = sqRe * iRe - sqIm * iIm;
  const cubeIm = sqRe * iIm + sqIm * iRe;
  const bend = delay * slope;
  out[4] = bend * (wide * cos * cubeRe - narrow * sin * cubeIm);
  out[5] = bend * (wide * cos * cubeIm + narrow * sin * cubeRe);
}

function armJetInto(
  out: Jet,
  factor: Jet,
  compiled: Compiled,
  armAt: number,
  ring: number,
  rings: number,
  omegaRad: number,
): void {
  const { cellConstants, ringConstants, ringKind } = compiled;
  const amplitude = cellConstants[armAt + ARM_CONSTANT.amplitude]!;
  const delay = cellConstants[armAt + ARM_CONSTANT.delay]!;
  const phase = delay * omegaRad + cellConstants[armAt + ARM_CONSTANT.phaseRad]!;
  const re = amplitude * Math.cos(phase);
  const im = -amplitude * Math.sin(phase);
  out[0] = re;
  out[1] = im;
  out[2] = delay * im;
  out[3] = -delay * re;
  out[4] = -delay * delay * re;
  out[5] = -delay * delay * im;
  for (let r = ring; r < ring + rings; r++) {
    if (ringKind[r] === UNCOUPLED) continue;
    ringJetInto(factor, ringConstants, r * RING_STRIDE, omegaRad);
    multiplyJet(out, factor);
  }
}

/** out ← p·a + q·b, each component; `turn` multiplies by −j. */
function combineInto(out: Jet, p: number, a: Jet, q: number, b: Jet, turn: boolean): void {
  for (let k = 0; k < 6; k += 2) {
    const re = p * a[k]! + q * b[k]!;
    const im = p * a[k + 1]! + q * b[k + 1]!;
    out[k] = turn ? im : re;
    out[k + 1] = turn ? -re : im;
  }
}

function addProduct(out: Jet, a: Jet, b: Jet, scratch: Jet): void {
  scratch.set(a);
  multiplyJet(scratch, b);
  for (let k = 0; k < 6; k++) out[k]! += scratch[k]!;
}

function cellJets(compiled: Compiled, w: PointWorkspace, c: number, both: boolean, omegaRad: number): void {
  const at = c * CELL_STRIDE;
  const k = compiled.cellConstants;
  const { firstRing, ringsPerArm } = compiled.cells[c]!;
  armJetInto(w.arm0, w.factor, compiled, at + CELL_CONSTANT.arm0, firstRing, ringsPerArm[0], omegaRad);
  armJetInto(
    w.arm1,
    w.factor,
    compiled,
    at + CELL_CONSTANT.arm1,
    firstRing + ringsPerArm[0],
    ringsPerArm[1],
    omegaRad,
  );
  const barBar = k[at + CELL_CONSTANT.barBar]!;
  const crossCross = k[at + CELL_CONSTANT.crossCross]!;
  const barCross = k[at + CELL_CONSTANT.barCross]!;
  const crossBar = k[at + CELL_CONSTANT.crossBar]!;
  combineInto(w.out1, barBar, w.arm0, -crossCross, w.arm1, false);
  combineInto(w.out2, barCross, w.arm0, crossBar, w.arm1, true);
  multiplyJet(w.out1, w.in1);
  multiplyJet(w.out2, w.in1);
  if (!both) return;
  const scratch = w.in1;
  combineInto(w.factor, crossBar, w.arm0, barCross, w.arm1, true);
  addProduct(w.out1, w.factor, w.in2, scratch);
  combineInto(w.factor, -crossCross, w.arm0, barBar, w.arm1, false);
  addProduct(w.out2, w.factor, w.in2, scratch);
}

/**
 * Fields of both outputs for light into in1 at one Ω, with derivatives, left in `workspace.out1` and `.out2`.
 * Cost: one sine and cosine a ring. Throws nothing: ranges were checked when the constants were made.
 */
export function evaluatePoint(compiled: Compiled, workspace: PointWorkspace, omegaRad: number): void {
  const w = workspace;
  w.in1.fill(0);
  w.in1[0] = 1;
  for (let c = 0; c < compiled.cells.length; c++) {
    const both = c > 0 && compiled.join === 'BOTH';
    if (c > 0) {
      w.in1.set(compiled.join === 'OUT2' ? w.out2 : w.out1);
      if (both) w.in2.set(w.out2);
    }
    cellJets(compiled, w, c, both, omegaRad);
  }
}
