/** What every passive circuit obeys, whatever its parameters. */
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  type CircuitParameters,
  createFieldBuffers,
  createKernel,
  evaluateInto,
  type FieldBuffers,
  netlistOf,
  solveNetlist,
} from '../../src/circuit/index.ts';
import { randomCircuits, randomOmegas } from './random-circuits.ts';

/** Rounding of up to 64 rings in a row, each a few 1e-14 at worst. */
const CONSERVED = 1e-11;
/** A whole turn adds ulp(3π + 2π) = 1.8e-15 to Ω and 64 rings of K ≥ 0.01 have a delay of up to 64·400 there. */
const REPEATS = 1e-10;

function fieldsOf(circuit: CircuitParameters, omega: Float64Array): FieldBuffers {
  const out = createFieldBuffers(omega.length);
  evaluateInto(createKernel(circuit), omega, out);
  return out;
}

const powerOf = (re: Float64Array, im: Float64Array, i: number) => re[i]! ** 2 + im[i]! ** 2;

describe('passive circuits', () => {
  it('conserve power on both outputs when lossless and joined by both guides [property]', () => {
    const circuits = randomCircuits({ leastCoupling: 1e-4, lossy: false, delays: 'ANY', joins: ['BOTH'] });
    fc.assert(
      fc.property(circuits, randomOmegas(), (circuit, omega) => {
        const f = fieldsOf(circuit, omega);
        for (let i = 0; i < omega.length; i++) {
          const sum = powerOf(f.out1Re, f.out1Im, i) + powerOf(f.out2Re, f.out2Im, i);
          expect(Math.abs(sum - 1)).toBeLessThan(CONSERVED);
        }
      }),
    );
  });

  it('conserve power when joined by one guide, counting what ends in absorbers [property]', () => {
    const circuits = randomCircuits({
      leastCoupling: 1e-2,
      lossy: false,
      delays: 'ANY',
      mostRings: 4,
      joins: ['OUT1', 'OUT2'],
    });
    fc.assert(
      fc.property(circuits, randomOmegas(), (circuit, omega) => {
        const netlist = netlistOf(circuit);
        const open = circuit.join === 'OUT1' ? 'out2' : 'out1';
        const dumps = circuit.cells
          .slice(1)
          .map((_, i) => [`dump${i}`, `cell${i + 1}.output.${open}`] as const);
        const absorbed = solveNetlist(
          { ...netlist, ports: { ...netlist.ports, ...Object.fromEntries(dumps) } },
          omega,
        );
        const f = fieldsOf(circuit, omega);
        for (let i = 0; i < omega.length; i++) {
          let sum = powerOf(f.out1Re, f.out1Im, i) + powerOf(f.out2Re, f.out2Im, i);
          for (const [port] of dumps) sum += powerOf(absorbed[port]!.re, absorbed[port]!.im, i);
          expect(Math.abs(sum - 1)).toBeLessThan(CONSERVED);
        }
      }),
      { numRuns: 60 },
    );
  });

  it('never amplify [property]', () => {
    fc.assert(
      fc.property(
        randomCircuits({ leastCoupling: 1e-4, lossy: true, delays: 'ANY' }),
        randomOmegas(),
        (circuit, omega) => {
          const f = fieldsOf(circuit, omega);
          for (let i = 0; i < omega.length; i++) {
            const sum = powerOf(f.out1Re, f.out1Im, i) + powerOf(f.out2Re, f.out2Im, i);
            expect(sum).toBeLessThan(1 + CONSERVED);
          }
        },
      ),
    );
  });

  it('repeat every FSR when all delays are whole [property]', () => {
    const circuits = randomCircuits({ leastCoupling: 1e-2, lossy: true, delays: 'INTEGER' });
    fc.assert(
      fc.property(circuits, randomOmegas(), (circuit, omega) => {
        const here = fieldsOf(circuit, omega);
        const there = fieldsOf(
          circuit,
          omega.map((x) => x + 2 * Math.PI),
        );
        for (const name of ['out1Re', 'out1Im', 'out2Re', 'out2Im'] as const)
          for (let i = 0; i < omega.length; i++)
            expect(Math.abs(here[name][i]! - there[name][i]!)).toBeLessThan(REPEATS);
      }),
    );
  });
});
