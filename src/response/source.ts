/** What curves, figures and compliance are taken from: one output, evaluated at offsets from the reference frequency. */
import {
  type CircuitParameters,
  createDelayBuffers,
  createFieldBuffers,
  createKernel,
  evaluateInto,
  evaluateWithGroupDelayInto,
  type FieldBuffers,
  type Kernel,
} from '../circuit/index.ts';
import { evaluateInto as evaluateFilterInto, groupDelayInto as filterDelayInto } from '../filter/index.ts';
import type { OutputPort } from '../filter/specification.ts';
import type { TransferFunction } from '../filter/transfer-function.ts';

/** Where a response changes fast: at `offsetGhz` and every `spacingGhz` from there, over about `halfWidthGhz`. */
export interface Feature {
  readonly offsetGhz: number;
  readonly halfWidthGhz: number;
  readonly spacingGhz: number;
}

export interface FieldSource {
  readonly fsrGhz: number;
  /** Its poles; a sampling that resolves them misses nothing of a passive circuit. */
  readonly features: readonly Feature[];
  /** All its delay in unit delays: how often the field can turn over one FSR. */
  readonly turns: number;
  /** Complex field at every offset, GHz. */
  fieldInto(offsetGhz: Float64Array, re: Float64Array, im: Float64Array): void;
  /** Group delay, ps, and where asked for its slope dτ/dν, ps/GHz. Not a number where the field vanishes. */
  groupDelayInto(offsetGhz: Float64Array, ps: Float64Array, slopePsPerGhz?: Float64Array): void;
}

/** Unit delay in ps. */
const unitDelayPs = (fsrGhz: number) => 1000 / fsrGhz;

function omegaOf(offsetGhz: Float64Array, fsrGhz: number): Float64Array {
  return offsetGhz.map((offset) => (2 * Math.PI * offset) / fsrGhz);
}

function ringFeatures(circuit: CircuitParameters, fsrGhz: number): Feature[] {
  const features: Feature[] = [];
  for (const { arms, couplerExcessLossDb } of circuit.cells) {
    for (const { rings } of arms) {
      for (const { powerCrossCoupling, phaseRad, lossDb, delay } of rings) {
        if (powerCrossCoupling === 0 || delay === 0) continue;
        const radius = Math.sqrt(1 - powerCrossCoupling) * 10 ** (-(lossDb + couplerExcessLossDb) / 20);
        const spacingGhz = fsrGhz / delay;
        const deficit = radius > 0.5 ? -Math.expm1(Math.log(radius)) : 1 - radius;
        features.push({
          offsetGhz: (-phaseRad / (2 * Math.PI)) * spacingGhz,
          halfWidthGhz: (deficit / (2 * Math.PI)) * spacingGhz,
          spacingGhz,
        });
      }
    }
  }
  return features;
}

function turnsOf(circuit: CircuitParameters): number {
  let turns = 0;
  for (const { arms } of circuit.cells)
    for (const { rings, delay } of arms) turns += delay + rings.reduce((sum, ring) => sum + ring.delay, 0);
  return turns;
}

/** One output of a circuit, by the kernel. Cost of the constructor: compiling the circuit. Throws as `createKernel`. */
export function sourceOfCircuit(circuit: CircuitParameters, output: OutputPort, fsrGhz: number): FieldSource {
  const kernel: Kernel = createKernel(circuit);
  const first = output === 'OUT1';
  const fieldsOf = (n: number, re: Float64Array, im: Float64Array): FieldBuffers => {
    const other = new Float64Array(n);
    return first
      ? { out1Re: re, out1Im: im, out2Re: other, out2Im: other }
      : { out1Re: other, out1Im: other, out2Re: re, out2Im: im };
  };
  const slopeScale = (unitDelayPs(fsrGhz) * 2 * Math.PI) / fsrGhz;
  return {
    fsrGhz,
    features: ringFeatures(circuit, fsrGhz),
    turns: turnsOf(circuit),
    fieldInto: (offsetGhz, re, im) =>
      evaluateInto(kernel, omegaOf(offsetGhz, fsrGhz), fieldsOf(offsetGhz.length, re, im)),
    groupDelayInto(offsetGhz, ps, slopePsPerGhz) {
      const n = offsetGhz.length;
      const delays = createDelayBuffers(n);
      evaluateWithGroupDelayInto(kernel, omegaOf(offsetGhz, fsrGhz), createFieldBuffers(n), delays);
      const delay = first ? delays.delay1 : delays.delay2;
      for (let i = 0; i < n; i++) ps[i] = delay[i]! * unitDelayPs(fsrGhz);
      if (slopePsPerGhz === undefined) return;
      const slope = first ? delays.slope1 : delays.slope2;
      for (let i = 0; i < n; i++) slopePsPerGhz[i] = slope[i]! * slopeScale;
    },
  };
}

/** A root ρ·e^{jθ} this near to the unit circle is a null and has no delay of its own (its phase only jumps). */
const ON_CIRCLE = 1e-12;

/**
 * dτ/dΩ of one factor (e^{jΩ} − ρ·e^{jθ}) in the denominator: its delay is ½ + (1 − ρ²)/(2·D), D = |e^{jΩ} − ρ·e^{jθ}|²
 * = (1 − ρ)² + 4ρ·sin²((Ω − θ)/2), hence −(1 − ρ²)·ρ·sin(Ω − θ)/D².
 */
function delaySlopeOf(radius: number, angle: number, omegaRad: number): number {
  const sine = Math.sin((omegaRad - angle) / 2);
  const distance = (1 - radius) ** 2 + 4 * radius * sine * sine;
  return (-(1 - radius) * (1 + radius) * radius * Math.sin(omegaRad - angle)) / distance ** 2;
}

/** A transfer function in factored form. */
export function sourceOfTransferFunction(filter: TransferFunction, fsrGhz: number): FieldSource {
  const polar = (roots: TransferFunction['poles']) =>
    roots.map(({ re, im }) => ({ radius: Math.hypot(re, im), angle: Math.atan2(im, re) }));
  const poles = polar(filter.poles);
  const zeros = polar(filter.zeros).filter(({ radius }) => Math.abs(radius - 1) >= ON_CIRCLE);
  return {
    fsrGhz,
    features: [...poles, ...zeros].map(({ radius, angle }) => ({
      offsetGhz: (angle / (2 * Math.PI)) * fsrGhz,
      halfWidthGhz: (Math.min(1, Math.abs(1 - radius)) / (2 * Math.PI)) * fsrGhz,
      spacingGhz: fsrGhz,
    })),
    turns: filter.poles.length,
    fieldInto: (offsetGhz, re, im) => evaluateFilterInto(filter, omegaOf(offsetGhz, fsrGhz), re, im),
    groupDelayInto(offsetGhz, ps, slopePsPerGhz) {
      const omega = omegaOf(offsetGhz, fsrGhz);
      filterDelayInto(filter, omega, ps);
      for (let i = 0; i < ps.length; i++) ps[i]! *= unitDelayPs(fsrGhz);
      if (slopePsPerGhz === undefined) return;
      const scale = (unitDelayPs(fsrGhz) * 2 * Math.PI) / fsrGhz;
      for (let i = 0; i < omega.length; i++) {
        let slope = 0;
        for (const { radius, angle } of poles) slope += delaySlopeOf(radius, angle, omega[i]!);
        for (const { radius, angle } of zeros) slope -= delaySlopeOf(radius, angle, omega[i]!);
        slopePsPerGhz[i] = slope * scale;
      }
    },
  };
}
