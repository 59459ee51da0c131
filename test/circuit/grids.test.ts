/** Even, almost even and uneven grids take different roads to their half angles and must arrive at the same fields. */
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { createPlainBlocks } from '../../src/circuit/blocks.ts';
import {
  type CircuitParameters,
  createDelayBuffers,
  createFieldBuffers,
  createKernel,
  evaluateInto,
  evaluateWithGroupDelayInto,
} from '../../src/circuit/index.ts';
import { randomCircuits } from './random-circuits.ts';

/** The contract of the kernel; the exact form keeps its digits at every frequency. */
const AGREEMENT = 1e-12;
/** Several blocks and a ragged end. */
const POINTS = 1111;

/** Disagreement of the kernel with the exact form over a grid. */
function worstError(circuit: CircuitParameters, omega: Float64Array, plain: boolean): number {
  const n = omega.length;
  const fast = createFieldBuffers(n);
  const exact = createFieldBuffers(n);
  const kernel = plain ? createKernel(circuit, createPlainBlocks()) : createKernel(circuit);
  evaluateInto(kernel, omega, fast);
  evaluateWithGroupDelayInto(kernel, omega, exact, createDelayBuffers(n));
  let worst = 0;
  for (const name of ['out1Re', 'out1Im', 'out2Re', 'out2Im'] as const)
    for (let i = 0; i < n; i++) worst = Math.max(worst, Math.abs(fast[name][i]! - exact[name][i]!));
  return worst;
}

const circuits = randomCircuits({ leastCoupling: 1e-7, lossy: true, delays: 'ANY', mostRings: 4 });
const starts = fc.tuple(
  fc.double({ min: -10, max: 10, noNaN: true }),
  fc.double({ min: 1e-6, max: 8, noNaN: true }),
);
const even = (start: number, span: number) =>
  Float64Array.from({ length: POINTS }, (_, i) => start + (span * i) / (POINTS - 1));

describe('grids', () => {
  it('that are even, upwards or downwards, give the exact fields, resonances of K = 1e-7 included [property]', () => {
    fc.assert(
      fc.property(circuits, starts, fc.boolean(), fc.boolean(), (circuit, [start, span], down, plain) => {
        const omega = even(start, span);
        expect(worstError(circuit, down ? omega.reverse() : omega, plain)).toBeLessThan(AGREEMENT);
      }),
      { numRuns: 60 },
    );
  });

  it('through the very resonance of narrow rings give the exact fields [property]', () => {
    fc.assert(
      fc.property(circuits, (circuit) => {
        const ring = circuit.cells.flatMap(({ arms }) => arms.flatMap(({ rings }) => rings))[0];
        const centre = ring === undefined ? 0 : -ring.phaseRad / ring.delay;
        const width = ring === undefined ? 1 : 40 * ring.powerCrossCoupling;
        expect(worstError(circuit, even(centre - width, 2 * width), false)).toBeLessThan(AGREEMENT);
      }),
      { numRuns: 60 },
    );
  });

  it('that are not even, or stray by less than anybody sees, give the exact fields [property]', () => {
    fc.assert(
      fc.property(circuits, fc.constantFrom(0, 1e-12, 1e-9, 1e-6, 1e-3), (circuit, stray) => {
        const omega = even(-3, 6).map((x, i) => x + stray * Math.sin(17 * i));
        expect(worstError(circuit, omega, false)).toBeLessThan(AGREEMENT);
        expect(
          worstError(
            circuit,
            omega.map((x) => x * x * x),
            false,
          ),
        ).toBeLessThan(AGREEMENT);
      }),
      { numRuns: 40 },
    );
  });

  it('of circuits with more different delays than tables go frequency by frequency', () => {
    const rings = Array.from({ length: 20 }, (_, i) => ({
      powerCrossCoupling: 0.3,
      phaseRad: i,
      lossDb: 0,
      delay: 1 + i / 7,
    }));
    const arm = { rings, delay: 0, phaseRad: 0, lossDb: 0 };
    const cell = {
      inputCoupling: 0.5,
      outputCoupling: 0.5,
      couplerExcessLossDb: 0,
      arms: [arm, arm] as const,
    };
    expect(worstError({ cells: [cell], join: 'OUT1' }, even(-3, 6), false)).toBe(0);
  });
});
