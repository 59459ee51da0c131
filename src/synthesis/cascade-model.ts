/**
 * Transmission of a cascade of ring-loaded interferometers and its exact gradient, over a fixed grid of Ω: what the
 * mask optimiser turns over thousands of times. Loss of rings, arms and couplers is in it. A parameter vector holds, cell
 * by cell, for every ring (arm 0 first) [u, φ], then the arm phase ψ (of arm 1 against arm 0), then, where the couplers
 * are free, [β_in, β_out]:  t = tanh u,  K = 1−t²,  K_in = sin²β_in. A negative t is the same ring half a turn on with
 * its sign in the arm phase; so neither K = 1 nor any phase is a wall to the optimiser.
 */
import type { InterferometerParameters, RingParameters } from '../circuit/index.ts';
import type { OutputPort } from '../filter/index.ts';
import { wrapPhase } from './ring.ts';

/** Power below which a null is not followed further: 10·log10 of it is −300 dB. */
const POWER_FLOOR = 1e-30;

const DB_PER_NEPER = 20 / Math.LN10;

interface RingPlan {
  readonly amplitude: number;
  /** e^(−jΩ·delay) on the grid. */
  readonly re: Float64Array;
  readonly im: Float64Array;
}

interface CellPlan {
  readonly first: number;
  readonly rings: readonly (readonly RingPlan[])[];
  readonly arms: readonly RingPlan[];
  readonly couplerAmplitude: number;
  readonly output: OutputPort;
  readonly betaIn: number;
  readonly betaOut: number;
}

export interface CascadeModel {
  readonly parameters: number;
  readonly points: number;
  /** Where the ring depths u stand in the parameter vector. */
  readonly depths: readonly number[];
  readonly pack: (cells: readonly InterferometerParameters[]) => Float64Array;
  readonly unpack: (parameters: Float64Array) => InterferometerParameters[];
  /** Transmission in dB at every point; Jacobian row by row, one row a point. */
  readonly evaluateInto: (
    parameters: Float64Array,
    powerDb: Float64Array,
    jacobian: Float64Array | null,
  ) => void;
}

const amplitudeOfDb = (lossDb: number): number => 10 ** (-lossDb / 20);

function delayPlan(delay: number, lossDb: number, omegaRad: Float64Array): RingPlan {
  return {
    amplitude: amplitudeOfDb(lossDb),
    re: omegaRad.map((omega) => Math.cos(omega * delay)),
    im: omegaRad.map((omega) => -Math.sin(omega * delay)),
  };
}

const couplerAngle = (coupling: number): number => Math.asin(Math.sqrt(coupling));

/** u of a ring's K, by the identity atanh√(1−K) = ln((1+t)/√K), which keeps its digits for small K. */
export function ringDepth(powerCrossCoupling: number): number {
  return Math.log((1 + Math.sqrt(1 - powerCrossCoupling)) / Math.sqrt(powerCrossCoupling));
}

function packCell(cell: InterferometerParameters, freeCouplers: boolean): number[] {
  const packed: number[] = [];
  for (const arm of cell.arms)
    for (const ring of arm.rings) packed.push(ringDepth(ring.powerCrossCoupling), ring.phaseRad);
  packed.push(cell.arms[1].phaseRad - cell.arms[0].phaseRad);
  if (freeCouplers) packed.push(couplerAngle(cell.inputCoupling), couplerAngle(cell.outputCoupling));
  return packed;
}

/** Turns negative t into half a turn of the ring and half a turn of its arm: R(−t, x) = −R(t, −x). */
function unpackCell(
  template: InterferometerParameters,
  parameters: Float64Array,
  first: number,
  freeCouplers: boolean,
): InterferometerParameters {
  let at = first;
  let flips = 0;
  const rings = template.arms.map((arm) =>
    arm.rings.map((ring): RingParameters => {
      const depth = parameters[at]!;
      const sech = 1 / Math.cosh(depth);
      const negative = depth < 0;
      if (negative) flips += 1;
      const phaseRad = wrapPhase(parameters[at + 1]! + (negative ? Math.PI : 0));
      at += 2;
      return { ...ring, powerCrossCoupling: sech * sech, phaseRad };
    }),
  );
  const armPhaseRad = wrapPhase(parameters[at]! + Math.PI * flips);
  at += 1;
  const couplers = freeCouplers
    ? {
        inputCoupling: Math.sin(parameters[at]!) ** 2,
        outputCoupling: Math.sin(parameters[at + 1]!) ** 2,
      }
    : {};
  return {
    ...template,
    ...couplers,
    arms: [
      { ...template.arms[0], rings: rings[0]!, phaseRad: 0 },
      { ...template.arms[1], rings: rings[1]!, phaseRad: armPhaseRad },
    ],
  };
}

/**
 * A model of `cells` (their structure and losses) on a grid. Cost of an evaluation: about 40 flops a ring and point,
 * 100 with the Jacobian; nothing is allocated.
 */
export function createCascadeModel(
  cells: readonly InterferometerParameters[],
  outputs: readonly OutputPort[],
  omegaRad: Float64Array,
  freeCouplers: boolean,
): CascadeModel {
  const plans: CellPlan[] = [];
  let size = 0;
  cells.forEach((cell, index) => {
    plans.push({
      first: size,
      rings: cell.arms.map((arm) => arm.rings.map((ring) => delayPlan(ring.delay, ring.lossDb, omegaRad))),
      arms: cell.arms.map((arm) => delayPlan(arm.delay, arm.lossDb, omegaRad)),
      couplerAmplitude: amplitudeOfDb(cell.couplerExcessLossDb),
      output: outputs[index]!,
      betaIn: couplerAngle(cell.inputCoupling),
      betaOut: couplerAngle(cell.outputCoupling),
    });
    size += packCell(cell, freeCouplers).length;
  });
  const parameters = size;
  const points = omegaRad.length;
  const widest = Math.max(1, ...plans.flatMap((plan) => plan.rings.map((rings) => rings.length)));
  const scratch = createScratch(widest);
  return {
    parameters,
    points,
    depths: plans.flatMap((plan) =>
      plan.rings.flat().map((_, k) => plan.first + 2 * k),
    ),
    pack: (given) => Float64Array.from(given.flatMap((cell) => packCell(cell, freeCouplers))),
    unpack: (given) => cells.map((cell, k) => unpackCell(cell, given, plans[k]!.first, freeCouplers)),
    evaluateInto: (given, powerDb, jacobian) => {
      powerDb.fill(0);
      for (const plan of plans) {
        loadCell(plan, given, scratch, freeCouplers);
        for (let point = 0; point < points; point++)
          cellInto(plan, point, scratch, powerDb, jacobian, parameters, freeCouplers);
      }
    },
  };
}

/** What one cell needs between points and rings; `[arm]` of fields, per ring of an arm. */
interface Scratch {
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

function createScratch(widest: number): Scratch {
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
function loadCell(plan: CellPlan, given: Float64Array, s: Scratch, freeCouplers: boolean): void {
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
function cellInto(
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
