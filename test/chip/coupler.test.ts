import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { circuitOfSetting, couplerAt, innerCouplings, thetaForCoupling } from '../../src/chip/index.ts';
import { type CircuitParameters, solveNetlist } from '../../src/circuit/index.ts';
import { builtNetlist, difference, fieldsOf, outputsOf } from './fields.ts';
import { anyChips, invent, spread, tunable } from './invented-chips.ts';

/** The contract of the folding algebra; both sides are sums and products of a few dozen numbers near 1. */
const FOLDED = 1e-12;
/** cos² of a phase of order 1, in doubles. */
const ROUNDING = 1e-14;
/** A field f = √(1−K) near a dark end carries the rounding of K, divided by 2f; some tens of roundings in all. */
const roundedField = (field: number) => (64 * Number.EPSILON) / Math.max(field, 1e-8);

/** A narrow ring on resonance multiplies the rounding of its √(1−K) by its round trips, 1/K. */
const narrowness = (circuit: CircuitParameters) =>
  circuit.cells
    .flatMap(({ arms }) => [...arms[0].rings, ...arms[1].rings])
    .reduce((sum, ring) => sum + (16 * Number.EPSILON) / Math.max(ring.powerCrossCoupling, 1e-15), 0);

const reaches = fc
  .record({
    low: spread(0, 0.3),
    high: spread(0.6, 1),
  })
  .chain(({ low, high }) =>
    fc
      .constantFrom('UPPER' as const, 'LOWER' as const)
      .map((heatedArm) => tunable('input', { minCoupling: low, maxCoupling: high, heatedArm })),
  );
const thetas = spread(-7, 7);

describe('tunable coupler', () => {
  it('follows −j·e^(−jθ/2)·[[sin θ/2, cos θ/2], [cos θ/2, −sin θ/2]] for two equal 50/50 couplers, sines negated on the other guide [cross-check]', () => {
    // Source: product of three 2 × 2 matrices by hand, coupler and phase shifter as in src/conventions.ts.
    for (const heatedArm of ['UPPER', 'LOWER'] as const)
      for (const theta of [-5.3, -2, -0.4, 0.7, 1.9, 3, 4.4]) {
        const sign = heatedArm === 'UPPER' ? 1 : -1;
        const state = couplerAt(tunable('input', { heatedArm }), theta);
        const t = Math.sqrt(1 - state.powerCrossCoupling);
        const k = Math.sqrt(state.powerCrossCoupling);
        const { outPhase1Rad: a, outPhase2Rad: b, inPhase1Rad: c } = state;
        const [sine, cosine] = [sign * Math.sin(theta / 2), Math.cos(theta / 2)];
        const entries = [
          [t, -(a + c), sine],
          [k, -a - Math.PI / 2, cosine],
          [k, -(b + c) - Math.PI / 2, cosine],
          [t, -b, -sine],
        ] as const;
        for (const [size, angle, factor] of entries) {
          expect(size * Math.cos(angle)).toBeCloseTo(factor * Math.cos(-theta / 2 - Math.PI / 2), 13);
          expect(size * Math.sin(angle)).toBeCloseTo(factor * Math.sin(-theta / 2 - Math.PI / 2), 13);
        }
      }
  });

  it('is the two directional couplers and the heated guide that it is built of, for any reach and phase [property]', () => {
    fc.assert(
      fc.property(reaches, thetas, (coupler, theta) => {
        const [first, second] = innerCouplings(coupler);
        const { powerCrossCoupling, outPhase1Rad, outPhase2Rad, inPhase1Rad } = couplerAt(coupler, theta);
        const guide = (id: string, phase: number) =>
          ({ id, kind: 'waveguide', delay: 0, phase, lossDb: 0 }) as const;
        const part = (id: string, k: number) =>
          ({ id, kind: 'coupler', powerCrossCoupling: k, excessLossDb: 0 }) as const;
        const upper = coupler.heatedArm === 'UPPER';
        const least = Math.sqrt(Math.min(powerCrossCoupling, 1 - powerCrossCoupling));
        const built = {
          elements: [
            part('a', first),
            part('b', second),
            guide('u', upper ? theta : 0),
            guide('l', upper ? 0 : theta),
          ],
          connections: [
            ['a.out1', 'u.in'],
            ['a.out2', 'l.in'],
            ['u.out', 'b.in1'],
            ['l.out', 'b.in2'],
          ],
          ports: { in1: 'a.in1', in2: 'a.in2', out1: 'b.out1', out2: 'b.out2' },
        } as const;
        const split = {
          elements: [
            guide('c', inPhase1Rad),
            part('k', powerCrossCoupling),
            guide('a', outPhase1Rad),
            guide('b', outPhase2Rad),
          ],
          connections: [
            ['c.out', 'k.in1'],
            ['k.out1', 'a.in'],
            ['k.out2', 'b.in'],
          ],
          ports: { in1: 'c.in', in2: 'k.in2', out1: 'a.out', out2: 'b.out' },
        } as const;
        for (const input of ['in1', 'in2'])
          for (const output of ['out1', 'out2']) {
            const one = solveNetlist(built, new Float64Array(1), input)[output]!;
            const other = solveNetlist(split, new Float64Array(1), input)[output]!;
            // No alignment: the phases are exact too.
            expect(Math.hypot(one.re[0]! - other.re[0]!, one.im[0]! - other.im[0]!)).toBeLessThan(
              roundedField(least),
            );
          }
      }),
    );
  });

  it('gives the coupling that it is asked for, on both branches, within its reach [property]', () => {
    fc.assert(
      fc.property(reaches, spread(0, 1), (coupler, share) => {
        const wanted = coupler.minCoupling + share * (coupler.maxCoupling - coupler.minCoupling);
        const [plus, minus] = thetaForCoupling(coupler, wanted);
        expect(minus).toBe(-plus);
        for (const theta of [plus, minus])
          expect(Math.abs(couplerAt(coupler, theta).powerCrossCoupling - wanted)).toBeLessThan(ROUNDING);
      }),
    );
  });

  it('has its two ends at sin²(α₁±α₂) of its inner couplers [cross-check]', () => {
    // Source: inner couplers of 0.45 and 0.52, α = asin√κ, sines by hand from the addition theorem.
    const [k1, k2] = [0.52, 0.45];
    const cross = Math.sqrt(k1 * (1 - k2));
    const bar = Math.sqrt(k2 * (1 - k1));
    const coupler = tunable('input', { minCoupling: (cross - bar) ** 2, maxCoupling: (cross + bar) ** 2 });
    expect(innerCouplings(coupler)[0]).toBeCloseTo(k1, 12);
    expect(innerCouplings(coupler)[1]).toBeCloseTo(k2, 12);
  });
});

describe('folding of coupler phases', () => {
  it('makes the circuit of any currents respond as the chip that is built of plain couplers [property]', () => {
    fc.assert(
      fc.property(anyChips, fc.integer({ min: 1, max: 2 ** 30 }), (chip, seed) => {
        const random = invent(seed);
        const currents = chip.channels.map(() => 18 * random());
        const powers = chip.channels.map((channel, i) => currents[i]! ** 2 * channel.resistanceOhm * 1e-3);
        const n = chip.channels.length;
        const phases = chip.channels.map((channel, i) =>
          powers.reduce(
            (phase, power, j) => phase + channel.phasePerMw * chip.crosstalk[i * n + j]! * power,
            channel.phaseAtZeroRad,
          ),
        );
        const circuit = circuitOfSetting(currents, chip);
        const folded = fieldsOf(circuit);
        const built = outputsOf(builtNetlist(chip, phases));
        const allowed = FOLDED + narrowness(circuit);
        expect(difference(folded.out1, built.out1)).toBeLessThan(allowed);
        expect(difference(folded.out2, built.out2)).toBeLessThan(allowed);
      }),
      { numRuns: 60 },
    );
  });
});
