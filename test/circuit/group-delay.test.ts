import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  createDelayBuffers,
  createFieldBuffers,
  createKernel,
  evaluateInto,
  evaluateWithGroupDelayInto,
} from '../../src/circuit/index.ts';
import { randomCircuits, randomOmegas } from './random-circuits.ts';

/** Step of the differences, rad. */
const STEP = 1e-5;
/** Rounding 1e-14/STEP, and truncation STEP²·d³/dΩ³ with delays of up to some hundred turns. */
const DIFFERENCE = 1e-5;
/** Fields by tables and by the exact form. */
const SAME = 1e-12;

describe('group delay', () => {
  it('is −Im(H′/H) of the field the kernel computes, with its slope, for circuits of every kind [cross-check] [property]', () => {
    const circuits = randomCircuits({ leastCoupling: 0.2, lossy: true, delays: 'ANY', mostRings: 3 });
    fc.assert(
      fc.property(circuits, randomOmegas(3), (circuit, omega) => {
        const kernel = createKernel(circuit);
        const n = omega.length;
        const [here, up, down, exact] = [0, 1, 2, 3].map(() => createFieldBuffers(n)) as [
          ReturnType<typeof createFieldBuffers>,
          ReturnType<typeof createFieldBuffers>,
          ReturnType<typeof createFieldBuffers>,
          ReturnType<typeof createFieldBuffers>,
        ];
        const [at, above, below] = [0, 1, 2].map(() => createDelayBuffers(n)) as [
          ReturnType<typeof createDelayBuffers>,
          ReturnType<typeof createDelayBuffers>,
          ReturnType<typeof createDelayBuffers>,
        ];
        evaluateInto(kernel, omega, here);
        evaluateWithGroupDelayInto(kernel, omega, exact, at);
        evaluateWithGroupDelayInto(
          kernel,
          omega.map((x) => x + STEP),
          up,
          above,
        );
        evaluateWithGroupDelayInto(
          kernel,
          omega.map((x) => x - STEP),
          down,
          below,
        );
        for (let i = 0; i < n; i++) {
          expect(
            Math.hypot(here.out2Re[i]! - exact.out2Re[i]!, here.out2Im[i]! - exact.out2Im[i]!),
          ).toBeLessThan(SAME);
          for (const [re, im, delay, slope, plus, minus] of [
            ['out1Re', 'out1Im', at.delay1[i]!, at.slope1[i]!, above.delay1[i]!, below.delay1[i]!],
            ['out2Re', 'out2Im', at.delay2[i]!, at.slope2[i]!, above.delay2[i]!, below.delay2[i]!],
          ] as const) {
            const size = Math.hypot(exact[re][i]!, exact[im][i]!);
            // next to a null the delay turns within less than the step
            if (size < 0.05) continue;
            const turn = Math.atan2(up[im][i]!, up[re][i]!) - Math.atan2(down[im][i]!, down[re][i]!);
            const wrapped = turn - 2 * Math.PI * Math.round(turn / (2 * Math.PI));
            const scale = 1 + Math.abs(delay) ** 3;
            expect(Math.abs(-wrapped / (2 * STEP) - delay)).toBeLessThan(DIFFERENCE * scale);
            expect(Math.abs((plus - minus) / (2 * STEP) - slope)).toBeLessThan(
              DIFFERENCE * scale * (1 + Math.abs(slope)),
            );
          }
        }
      }),
    );
  });
});
