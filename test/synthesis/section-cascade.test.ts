import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { netlistOf, solveNetlist } from '../../src/circuit/index.ts';
import { Refusal } from '../../src/errors.ts';
import {
  designHighPass,
  designLowPass,
  evaluateInto,
  type Family,
  type LabelledFilter,
  type OutputPort,
  rotateFilter,
  type TransferFunction,
} from '../../src/filter/index.ts';
import {
  type CascadeCell,
  circuitOfCascade,
  productOf,
  sectionCount,
  sectionOf,
  synthesiseSectionCascade,
  withLosses,
} from '../../src/synthesis/index.ts';
import { poleAwareGrid } from './reference.ts';

/** The promise of the ideal circuit: largest absolute field error up to order 10, by the netlist solver. */
const FIELD = 1e-9;

const halfBand = designLowPass({
  family: 'ELLIPTIC',
  order: 4,
  edgeRad: 0.5 * Math.PI,
  rippleDb: 2,
  rejectionDb: 40,
});

const all = (output: OutputPort, order: number): OutputPort[] =>
  Array.from({ length: sectionCount(order) }, () => output);

function fieldsOf(filter: TransferFunction, omegaRad: Float64Array) {
  const re = new Float64Array(omegaRad.length);
  const im = new Float64Array(omegaRad.length);
  evaluateInto(filter, omegaRad, re, im);
  return { re, im };
}

/** Largest difference between the cells' circuit, by the netlist solver, and a transfer function. */
function circuitError(
  cells: readonly CascadeCell[],
  filter: TransferFunction,
  omegaRad: Float64Array,
): number {
  const outputs = solveNetlist(netlistOf(circuitOfCascade(cells)), omegaRad);
  const own = outputs[cells.at(-1)!.output.toLowerCase()]!;
  const wanted = fieldsOf(filter, omegaRad);
  return own.re.reduce(
    (worst, re, k) => Math.max(worst, Math.hypot(re - wanted.re[k]!, own.im[k]! - wanted.im[k]!)),
    0,
  );
}

function familyFilter(family: Family, order: number, edgeRad: number, high: boolean): LabelledFilter {
  const ask = {
    family,
    order,
    edgeRad,
    ...(family === 'CHEBYSHEV_I' || family === 'ELLIPTIC' ? { rippleDb: 1 } : {}),
    ...(family === 'CHEBYSHEV_II' || family === 'ELLIPTIC' ? { rejectionDb: 40 } : {}),
  };
  return high ? designHighPass(ask) : designLowPass(ask);
}

describe('cascade of exact sections', () => {
  it('fourth-order half-band, 2 dB and 40 dB: two conjugate sections cost 10.5 dB, two pairings differ by 3.5 dB (common practice, no source) [regression]', () => {
    const cascade = synthesiseSectionCascade(halfBand, ['OUT2', 'OUT2']);
    expect(cascade.insertionLossDb).toBeCloseTo(10.5, 1);
    expect(cascade.pairing.considered).toBe(2);
    expect(-20 * Math.log10(cascade.constant.abs())).toBeCloseTo(cascade.insertionLossDb, 6);
    expect(cascade.partialPeaksDb.at(-1)).toBeCloseTo(-cascade.insertionLossDb, 2);
  });

  it('second-order Chebyshev II of 10 dB and edge 0.5π is one section without loss (common practice, no source) [cross-check]', () => {
    const filter = designLowPass({
      family: 'CHEBYSHEV_II',
      order: 2,
      edgeRad: 0.5 * Math.PI,
      rejectionDb: 10,
    });
    const cascade = synthesiseSectionCascade(filter, ['OUT1']);
    expect(cascade.insertionLossDb).toBeLessThan(1e-9);
    const turned = { ...filter, gain: filter.gain.mul(cascade.constant) };
    expect(circuitError(cascade.cells, turned, poleAwareGrid(filter.poles))).toBeLessThan(FIELD);
  });

  it('any family, order to 10, edge, centre and outputs: the circuit is constant·H and every section is the stated one [property]', () => {
    fc.assert(
      fc.property(
        fc.constantFrom<Family>('BUTTERWORTH', 'CHEBYSHEV_I', 'CHEBYSHEV_II', 'ELLIPTIC'),
        fc.integer({ min: 1, max: 10 }),
        fc.double({ min: 0.1, max: 0.9, noNaN: true }),
        fc.double({ min: -Math.PI, max: Math.PI, noNaN: true }),
        fc.constantFrom<OutputPort>('OUT1', 'OUT2'),
        fc.constantFrom<OutputPort>('OUT1', 'OUT2'),
        fc.boolean(),
        (family, order, edge, centreRad, join, last, high) => {
          const filter = rotateFilter(familyFilter(family, order, edge * Math.PI, high), centreRad);
          const outputs = [...all(join, order).slice(1), last];
          const { cells, constant, insertionLossDb } = synthesiseSectionCascade(filter, outputs);
          const grid = poleAwareGrid(filter.poles, 16);
          const turned = { ...filter, gain: filter.gain.mul(constant) };
          expect(circuitError(cells, turned, grid)).toBeLessThan(FIELD);
          expect(circuitError(cells, productOf(cells.map((cell) => cell.section)), grid)).toBeLessThan(FIELD);
          for (const cell of cells) {
            expect(circuitError([cell], cell.section, grid)).toBeLessThan(FIELD);
            expect(cell.section.peakDb).toBeLessThan(1e-9);
          }
          expect(constant.abs()).toBeLessThan(1 + 1e-9);
          expect(insertionLossDb).toBeGreaterThan(-1e-9);
        },
      ),
      { numRuns: 60, seed: 41 },
    );
  });

  it('every partial peak is the greatest transmission of the cells so far [cross-check]', () => {
    const filter = familyFilter('ELLIPTIC', 7, 0.3 * Math.PI, false);
    const { cells, partialPeaksDb } = synthesiseSectionCascade(filter, all('OUT1', 7));
    const grid = poleAwareGrid(filter.poles, 4096);
    cells.forEach((_, k) => {
      const { out1 } = solveNetlist(netlistOf(circuitOfCascade(cells.slice(0, k + 1))), grid);
      const peak = out1!.re.reduce((most, re, at) => Math.max(most, Math.hypot(re, out1!.im[at]!)), 0);
      expect(20 * Math.log10(peak)).toBeCloseTo(partialPeaksDb[k]!, 2);
    });
  });
});

describe('a cell as zeros, poles and gain', () => {
  it('any lossy cell with one ring an arm and any couplers is the stated transfer function on both outputs [property]', () => {
    const coupling = fc.double({ min: 0.01, max: 0.99, noNaN: true });
    const phase = fc.double({ min: -3, max: 3, noNaN: true });
    fc.assert(
      fc.property(
        fc.record({
          a: coupling,
          b: coupling,
          kIn: coupling,
          kOut: coupling,
          p: phase,
          q: phase,
          psi: phase,
        }),
        fc.double({ min: 0, max: 2, noNaN: true }),
        fc.constantFrom<OutputPort>('OUT1', 'OUT2'),
        ({ a, b, kIn, kOut, p, q, psi }, ringLossDb, output) => {
          const ring = (powerCrossCoupling: number, phaseRad: number) => ({
            powerCrossCoupling,
            phaseRad,
            lossDb: 0,
            delay: 1,
          });
          const arm = (rings: readonly ReturnType<typeof ring>[], phaseRad: number) => ({
            rings,
            delay: 0,
            phaseRad,
            lossDb: 0.1,
          });
          const interferometer = withLosses(
            {
              inputCoupling: kIn,
              outputCoupling: kOut,
              couplerExcessLossDb: 0,
              arms: [arm([ring(a, p)], 0.3), arm([ring(b, q)], psi)],
            },
            { ringLossDb, couplerExcessLossDb: 0.05 },
          );
          const section = sectionOf(interferometer, output);
          const grid = poleAwareGrid(section.poles, 32);
          expect(circuitError([{ interferometer, output, section }], section, grid)).toBeLessThan(FIELD);
        },
      ),
      { numRuns: 100, seed: 5 },
    );
  });

  it('more than one ring an arm is a RangeError [property]', () => {
    const { cells } = synthesiseSectionCascade(halfBand, ['OUT2', 'OUT2']);
    const [first] = cells;
    const arm = first!.interferometer.arms[0];
    const crowded = {
      ...first!.interferometer,
      arms: [{ ...arm, rings: [...arm.rings, ...arm.rings] }, arm] as const,
    };
    expect(() => sectionOf(crowded, 'OUT1')).toThrow(RangeError);
  });
});

describe('what a cascade of sections refuses', () => {
  it('a number of cells that is not that of the sections [property]', () => {
    expect(() => synthesiseSectionCascade(halfBand, ['OUT1'])).toThrow(Refusal);
    expect(() => synthesiseSectionCascade(halfBand, ['OUT1', 'OUT1', 'OUT1'])).toThrow(Refusal);
  });

  it('a filter whose zeros no pair of rings can null together [property]', () => {
    const skewed = {
      ...halfBand,
      zeros: halfBand.zeros.map((zero, k) => (k === 0 ? zero.mul({ abs: 1, arg: 0.3 }) : zero)),
    };
    expect(() => synthesiseSectionCascade(skewed, ['OUT1', 'OUT1'])).toThrow(Refusal);
  });

  it('cells that lead on by different outputs as one circuit: RangeError [property]', () => {
    const { cells } = synthesiseSectionCascade(familyFilter('ELLIPTIC', 6, 1, false), [
      'OUT1',
      'OUT2',
      'OUT1',
    ]);
    expect(() => circuitOfCascade(cells)).toThrow(RangeError);
  });
});
