/**
 * The kernel and the general solver share no formula: one multiplies closed forms of rings, the other solves the
 * scattering equations of every element at once. Where they agree, both are right.
 */
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  type CircuitParameters,
  createFieldBuffers,
  createKernel,
  evaluateInto,
  netlistOf,
  solveNetlist,
  updateKernel,
} from '../../src/circuit/index.ts';
import { randomCircuits, randomOmegas } from './random-circuits.ts';

/** The contract of kernel and solver for K ≥ 1e-4 at frequencies not singled out. */
const AGREEMENT = 1e-12;

/**
 * Beyond it: rounding of the solver's own √(1−K), amplified by the round trips in a ring, K/|1 − t·x|² of them: 4/K on
 * resonance, next to nothing elsewhere.
 */
function amplifiedRounding(circuit: CircuitParameters, omegaRad: number): number {
  let sum = 0;
  for (const { arms } of circuit.cells)
    for (const { rings } of arms)
      for (const { powerCrossCoupling: k, phaseRad, delay } of rings) {
        const chord = 2 * Math.sin((delay * omegaRad + phaseRad) / 2);
        if (k > 0) sum += k / ((k * k) / 4 + chord * chord);
      }
  return Number.EPSILON * sum;
}

/** Greatest disagreement beyond what is allowed at its frequency. */
function worstExcess(circuit: CircuitParameters, omegaRad: Float64Array): number {
  const out = createFieldBuffers(omegaRad.length);
  evaluateInto(createKernel(circuit), omegaRad, out);
  const solved = solveNetlist(netlistOf(circuit), omegaRad);
  let worst = Number.NEGATIVE_INFINITY;
  for (let i = 0; i < omegaRad.length; i++) {
    const apart = Math.max(
      Math.hypot(out.out1Re[i]! - solved.out1!.re[i]!, out.out1Im[i]! - solved.out1!.im[i]!),
      Math.hypot(out.out2Re[i]! - solved.out2!.re[i]!, out.out2Im[i]! - solved.out2!.im[i]!),
    );
    worst = Math.max(worst, apart - AGREEMENT - amplifiedRounding(circuit, omegaRad[i]!));
  }
  return worst;
}

/** Ω of every ring's resonance and a little beside it. */
function resonances(circuit: CircuitParameters): Float64Array {
  const list: number[] = [];
  for (const { arms } of circuit.cells)
    for (const { rings } of arms)
      for (const { phaseRad, delay, powerCrossCoupling: k } of rings)
        for (const widths of [0, 0.5, -2]) list.push((-phaseRad + (widths * k) / 2) / delay);
  return Float64Array.from(list.length > 0 ? list : [0]);
}

describe('kernel and solver', () => {
  it('agree to 1e-12 on lossless circuits of unit delays with K ≥ 1e-4 [cross-check] [property]', () => {
    fc.assert(
      fc.property(
        randomCircuits({ leastCoupling: 1e-4, lossy: false, delays: 'UNIT' }),
        randomOmegas(),
        (circuit, omega) => {
          expect(worstExcess(circuit, omega)).toBeLessThan(0);
        },
      ),
      { numRuns: 150 },
    );
  });

  it('agree to 1e-12 with losses and delays of any length [cross-check] [property]', () => {
    fc.assert(
      fc.property(
        randomCircuits({ leastCoupling: 1e-4, lossy: true, delays: 'ANY' }),
        randomOmegas(),
        (circuit, omega) => {
          expect(worstExcess(circuit, omega)).toBeLessThan(0);
        },
      ),
      { numRuns: 150 },
    );
  });

  it('agree on and beside every resonance within the amplified rounding [cross-check] [property]', () => {
    fc.assert(
      fc.property(
        randomCircuits({ leastCoupling: 1e-6, lossy: true, delays: 'ANY', mostRings: 4 }),
        (circuit) => {
          expect(worstExcess(circuit, resonances(circuit))).toBeLessThan(0);
        },
      ),
      { numRuns: 100 },
    );
  });

  it('an updated kernel computes what a new one does [property]', () => {
    const circuits = randomCircuits({ leastCoupling: 1e-3, lossy: true, delays: 'ANY' });
    fc.assert(
      fc.property(
        circuits,
        randomOmegas(),
        fc.double({ min: 0.1, max: 0.9, noNaN: true }),
        (circuit, omega, share) => {
          const other: CircuitParameters = {
            join: circuit.join,
            cells: circuit.cells.map((cell) => ({
              ...cell,
              inputCoupling: share,
              couplerExcessLossDb: share,
            })),
          };
          const kernel = createKernel(circuit);
          const updated = createFieldBuffers(omega.length);
          const fresh = createFieldBuffers(omega.length);
          updateKernel(kernel, other);
          evaluateInto(kernel, omega, updated);
          evaluateInto(createKernel(other), omega, fresh);
          expect(updated).toEqual(fresh);
        },
      ),
      { numRuns: 50 },
    );
  });
});
