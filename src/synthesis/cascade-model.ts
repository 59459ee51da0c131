/**
 * Transmission of a cascade of ring-loaded interferometers and its exact gradient, over a fixed grid of Ω: what the
 * mask optimiser turns over thousands of times. Loss of rings, arms and couplers is in it. A parameter vector holds, cell
 * by cell, for every ring (arm 0 first) [u, φ], then the arm phase ψ (of arm 1 against arm 0), then, where the couplers
 * are free, [β_in, β_out]:  t = tanh u,  K = 1−t²,  K_in = sin²β_in. A negative t is the same ring half a turn on with
 * its sign in the arm phase; so neither K = 1 nor any phase is a wall to the optimiser.
 */
import type { InterferometerParameters, RingParameters } from '../circuit/index.ts';
import type { OutputPort } from '../filter/index.ts';
import { type CellPlan, cellInto, createScratch, loadCell, type RingPlan } from './cascade-cell.ts';
import { wrapPhase } from './ring.ts';

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
    depths: plans.flatMap((plan) => plan.rings.flat().map((_, k) => plan.first + 2 * k)),
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
