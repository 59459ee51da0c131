/** The search for worst points against brute force. */
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { createFieldBuffers, createKernel, evaluateInto } from '../../src/circuit/index.ts';
import { refineLeast } from '../../src/response/extremes.ts';
import { complianceOf, powerExtremes, sourceOfCircuit } from '../../src/response/index.ts';
import { randomCircuits } from '../circuit/random-circuits.ts';

const FSR_GHZ = 50;
/** Brute force: a step of 2e-4 GHz, 2.5e-5 rad, a fourth of the half width of a ring of K = 1e-4. */
const POINTS = 250_001;
/** Of power. The search may beat brute force, not lose to it. */
const LOSES_BY = 1e-9;

describe('worst points', () => {
  it('are no better than any of 250,000 frequencies, with resonances of K down to 1e-4 [property]', () => {
    const circuits = randomCircuits({ leastCoupling: 1e-4, lossy: true, delays: 'INTEGER', mostRings: 4 });
    fc.assert(
      fc.property(circuits, fc.integer({ min: 1, max: 50 }), (circuit, widthGhz) => {
        const source = sourceOfCircuit(circuit, 'OUT2', FSR_GHZ);
        const band = { lowGhz: -7, highGhz: -7 + widthGhz };
        const { greatest, least } = powerExtremes(source, band);
        const out = createFieldBuffers(POINTS);
        const omega = Float64Array.from(
          { length: POINTS },
          (_, i) => (2 * Math.PI * (band.lowGhz + (widthGhz * i) / (POINTS - 1))) / FSR_GHZ,
        );
        evaluateInto(createKernel(circuit), omega, out);
        let most = 0;
        let fewest = Number.POSITIVE_INFINITY;
        for (let i = 0; i < POINTS; i++) {
          const power = out.out2Re[i]! ** 2 + out.out2Im[i]! ** 2;
          most = Math.max(most, power);
          fewest = Math.min(fewest, power);
        }
        expect(greatest.value).toBeGreaterThan(most - LOSES_BY);
        expect(least.value).toBeLessThan(fewest + LOSES_BY);
        expect(greatest.value).toBeLessThan(1 + LOSES_BY);
        expect(greatest.at).toBeGreaterThanOrEqual(band.lowGhz);
        expect(least.at).toBeLessThanOrEqual(band.highGhz);
      }),
      { numRuns: 25 },
    );
  });

  it('of a response that is flat or dark but for rounding are found without climbing every speck of it [regression]', () => {
    const ring = (phaseRad: number) => ({ powerCrossCoupling: 0.3, phaseRad, lossDb: 0, delay: 1 });
    const arm = { rings: [ring(0.4), ring(-1.1), ring(2.3)], delay: 0, phaseRad: 0, lossDb: 0 };
    const cell = {
      inputCoupling: 0.5,
      outputCoupling: 0.5,
      couplerExcessLossDb: 0,
      arms: [arm, arm] as const,
    };
    let asked = 0;
    for (const output of ['OUT1', 'OUT2'] as const) {
      const source = sourceOfCircuit({ cells: [cell], join: 'OUT1' }, output, FSR_GHZ);
      const counted = {
        ...source,
        fieldInto(offsetGhz: Float64Array, re: Float64Array, im: Float64Array) {
          asked++;
          source.fieldInto(offsetGhz, re, im);
        },
      };
      const { greatest, least } = powerExtremes(counted, { lowGhz: 0, highGhz: FSR_GHZ });
      const level = output === 'OUT1' ? 0 : 1;
      expect(Math.abs(greatest.value - level)).toBeLessThan(1e-12);
      expect(Math.abs(least.value - level)).toBeLessThan(1e-12);
    }
    // Two equal arms: everything comes out at the cross output. 1,200 samples, nearly each of them a speck.
    expect(asked).toBeLessThan(200);
  });

  it('of a smooth curve are met to the square of the position [published]', () => {
    // R. P. Brent 1973, ch. 5.6 (from memory): the least of Σ ((2i − 5)/(x − i²))², i = 1…20, between the poles 1 and 4 is at
    // 3.0229153 with value 3.6766990169
    const f = (x: number) => {
      let sum = 0;
      for (let i = 1; i <= 20; i++) sum += ((2 * i - 5) / (x - i * i)) ** 2;
      return sum;
    };
    const found = refineLeast(f, 1.01, 3.99, 2.5);
    expect(Math.abs(found.at - 3.0229153)).toBeLessThan(1e-7);
    expect(Math.abs(found.value - 3.6766990169)).toBeLessThan(1e-10);
  });

  it('refuse a mask that demands nothing', () => {
    const plain = { rings: [], delay: 0, phaseRad: 0, lossDb: 0 };
    const cell = {
      inputCoupling: 0,
      outputCoupling: 0,
      couplerExcessLossDb: 0,
      arms: [plain, plain] as const,
    };
    const source = sourceOfCircuit({ cells: [cell], join: 'OUT1' }, 'OUT1', FSR_GHZ);
    expect(() => complianceOf({ OUT1: source, OUT2: source }, { reference: 'INPUT', bands: [] })).toThrow(
      RangeError,
    );
  });
});
