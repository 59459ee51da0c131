/** The WebAssembly loops against the plain ones that state what they compute, and against the source they were built from. */
import { readFile } from 'node:fs/promises';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { asModule, buildKernel } from '../../scripts/build-kernel.ts';
import { createPlainBlocks } from '../../src/circuit/blocks.ts';
import { createFieldBuffers, createKernel, evaluateInto } from '../../src/circuit/index.ts';
import { loadVectorBlocks } from '../../src/circuit/wasm/load.ts';
import { randomCircuits } from './random-circuits.ts';

/** Both round the same formula, in another order; a narrow ring amplifies that until its exact window takes over. */
const SAME_FORMULA = 1e-12;
/** Last-place rounding of sine and cosine. */
const LAST_PLACE = 2.5e-16;
/** Three frequencies past a whole block, to try the ragged end. */
const POINTS = 259;

describe('vector loops', () => {
  it('compute what the plain loops compute, on grids of any length [cross-check] [property]', () => {
    const vector = loadVectorBlocks();
    if (vector === null) throw new Error('this machine has no WebAssembly SIMD');
    const plain = createPlainBlocks();
    const circuits = randomCircuits({ leastCoupling: 1e-3, lossy: true, delays: 'ANY' });
    fc.assert(
      fc.property(circuits, fc.integer({ min: 1, max: POINTS }), (circuit, n) => {
        const omega = Float64Array.from({ length: n }, (_, i) => -10 + (20 * i) / POINTS);
        const fast = createFieldBuffers(n);
        const slow = createFieldBuffers(n);
        evaluateInto(createKernel(circuit, vector), omega, fast);
        evaluateInto(createKernel(circuit, plain), omega, slow);
        for (const name of ['out1Re', 'out1Im', 'out2Re', 'out2Im'] as const)
          for (let i = 0; i < n; i++)
            expect(Math.abs(fast[name][i]! - slow[name][i]!)).toBeLessThan(SAME_FORMULA);
      }),
      { numRuns: 60 },
    );
  });

  it('have sine and cosine to the last place out to a million rad [cross-check with Math.sin and Math.cos]', () => {
    const vector = loadVectorBlocks();
    if (vector === null) throw new Error('this machine has no WebAssembly SIMD');
    const angles = Array.from({ length: 256 }, (_, i) => (i % 2 ? -1 : 1) * 1.1 ** (i - 110)).filter(
      (x) => Math.abs(x) < 1e6,
    );
    angles.push(0, Math.PI, Math.PI / 4, -Math.PI / 4, Math.PI / 2);
    while (angles.length % 4) angles.push(1);
    vector.heap.set(angles, 0);
    vector.halfAngles(angles.length, 0, 1, 1024, 2048);
    angles.forEach((angle, i) => {
      expect(Math.abs(vector.heap[1024 + i]! - Math.cos(angle))).toBeLessThan(LAST_PLACE);
      expect(Math.abs(vector.heap[2048 + i]! - Math.sin(angle))).toBeLessThan(LAST_PLACE);
    });
  });

  it('are the binary that their source compiles to [regression]', async () => {
    const kept = await readFile(
      new URL('../../src/circuit/wasm/binary.generated.ts', import.meta.url),
      'utf8',
    );
    expect(asModule(await buildKernel())).toBe(kept);
  });
});
