import { Complex } from 'complex.js';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { netlistOf, solveNetlist } from '../../src/circuit/index.ts';
import { Refusal } from '../../src/errors.ts';
import {
  designHalfBand,
  designHighPass,
  designLowPass,
  evaluateInto,
  type Family,
  type LabelledFilter,
  type OutputPort,
  rotateFilter,
} from '../../src/filter/index.ts';
import { refuseUndercoupled, synthesiseAllPassPair, withLosses } from '../../src/synthesis/index.ts';
import { filterOf, poleAwareGrid, referencePairs } from './reference.ts';

/** The promise of the ideal circuit: largest absolute field error up to order 10, by the netlist solver. */
const FIELD = 1e-9;
/** Rounding of a lossless power sum over a few tens of elements. */
const POWER = 1e-12;

const other = (output: OutputPort): OutputPort => (output === 'OUT1' ? 'OUT2' : 'OUT1');

/** Both outputs of the pair by the netlist solver, and H turned by the reported phase. */
function solved(filter: LabelledFilter, output: OutputPort, omegaRad: Float64Array) {
  const pair = synthesiseAllPassPair(filter, output);
  const outputs = solveNetlist(netlistOf({ cells: [pair.interferometer], join: 'OUT1' }), omegaRad);
  const wantedRe = new Float64Array(omegaRad.length);
  const wantedIm = new Float64Array(omegaRad.length);
  evaluateInto(filter, omegaRad, wantedRe, wantedIm);
  const turn = new Complex(0, pair.constantPhaseRad).exp();
  let fieldError = 0;
  let powerError = 0;
  const own = outputs[output.toLowerCase()]!;
  const complement = outputs[other(output).toLowerCase()]!;
  for (let k = 0; k < omegaRad.length; k++) {
    const wanted = new Complex(wantedRe[k]!, wantedIm[k]!).mul(turn);
    fieldError = Math.max(fieldError, Math.hypot(own.re[k]! - wanted.re, own.im[k]! - wanted.im));
    const power = own.re[k]! ** 2 + own.im[k]! ** 2 + complement.re[k]! ** 2 + complement.im[k]! ** 2;
    powerError = Math.max(powerError, Math.abs(power - 1));
  }
  return { pair, own, fieldError, powerError };
}

const OUTPUTS: readonly OutputPort[] = ['OUT1', 'OUT2'];

describe('all-pass pair against published decompositions', () => {
  // Sources: in each entry of test/reference/synthesis-all-pass-pairs.json (rings.json and end-to-end chains in 60-digit
  // arithmetic from Vaidyanathan 1986 and Madsen 1998; half-band pairs after Valenzuela and Constantinides 1983).
  for (const reference of referencePairs()) {
    const filter = filterOf(reference);
    it(`${reference.id}: ring couplings, phases and arm phase are the published ones [published]`, () => {
      for (const output of OUTPUTS) {
        const { interferometer } = synthesiseAllPassPair(filter, output);
        reference.arms.forEach((rings, arm) => {
          rings.forEach((ring, k) => {
            const got = interferometer.arms[arm as 0 | 1].rings[k]!;
            expect(Math.abs(got.powerCrossCoupling - ring.K)).toBeLessThan(reference.tolerance.coupling!);
            if (ring.phase_rad !== undefined && ring.K < 1)
              expect(Math.abs(Math.sin((got.phaseRad - ring.phase_rad) / 2))).toBeLessThan(
                reference.tolerance.phaseRad!,
              );
          });
        });
        if (reference.armPhaseDifferenceRad !== undefined) {
          const psi = interferometer.arms[1].phaseRad - (output === 'OUT1' ? Math.PI : 0);
          expect(Math.abs(Math.sin((psi - reference.armPhaseDifferenceRad) / 2))).toBeLessThan(
            reference.tolerance.phaseRad!,
          );
        }
      }
    });

    it(`${reference.id}: the circuit's field and power, by the netlist solver, are the published ones [published]`, () => {
      for (const output of OUTPUTS) {
        for (const [at, re, im] of reference.fieldSamples ?? []) {
          const { own, pair } = solved(filter, output, Float64Array.of(at * Math.PI));
          const turn = new Complex(0, -pair.constantPhaseRad).exp();
          const field = new Complex(own.re[0]!, own.im[0]!).mul(turn);
          expect(Math.hypot(field.re - re, field.im - im)).toBeLessThan(FIELD);
        }
        const powers = [
          ...(reference.powerSamples ?? []).map(
            ([offset, db]) => [offset / (reference.fsrGhz! / 2), db] as const,
          ),
          ...(reference.powerSamplesNyquist ?? []),
        ];
        for (const [at, db] of powers) {
          const { own } = solved(filter, output, Float64Array.of(at * Math.PI));
          const amplitude = Math.hypot(own.re[0]!, own.im[0]!);
          expect(Math.abs(amplitude - (db === null ? 0 : 10 ** (db / 20)))).toBeLessThan(FIELD);
        }
      }
    });

    it(`${reference.id}: meets H over the FSR on either output, the other output its complement [cross-check]`, () => {
      const grid = poleAwareGrid(filter.poles, 64);
      for (const output of OUTPUTS) {
        const { fieldError, powerError } = solved(filter, output, grid);
        expect(fieldError).toBeLessThan(FIELD);
        expect(powerError).toBeLessThan(POWER);
      }
    });
  }
});

const FAMILIES: readonly Family[] = ['BUTTERWORTH', 'CHEBYSHEV_I', 'CHEBYSHEV_II', 'ELLIPTIC'];

/** Elliptic and Chebyshev values a lab would ask. */
const RIPPLE_DB = 0.5;
const REJECTION_DB = 40;

function familyFilter(family: Family, order: number, edgeRad: number, high: boolean): LabelledFilter {
  const rippled = family === 'CHEBYSHEV_I' || family === 'ELLIPTIC';
  const rejecting = family === 'CHEBYSHEV_II' || family === 'ELLIPTIC';
  const ask = {
    family,
    order,
    edgeRad,
    ...(rippled ? { rippleDb: RIPPLE_DB } : {}),
    ...(rejecting ? { rejectionDb: REJECTION_DB } : {}),
  };
  return high ? designHighPass(ask) : designLowPass(ask);
}

describe('all-pass pair of the classical families', () => {
  /** Orders 11 to 16 have poles nearer the circle; their rounding alone costs a digit or two more than FIELD allows. */
  const HIGH_ORDER_FIELD = 1e-8;
  for (const family of FAMILIES) {
    it(`${family}: orders 1 to 16, low- and high-pass, meet H by the netlist solver [cross-check]`, () => {
      for (let order = 1; order <= 16; order++) {
        const filter = familyFilter(family, order, 0.3 * Math.PI, order % 3 === 0);
        const { fieldError } = solved(filter, order % 2 ? 'OUT1' : 'OUT2', poleAwareGrid(filter.poles, 32));
        expect(fieldError, `order ${order}`).toBeLessThan(order <= 10 ? FIELD : HIGH_ORDER_FIELD);
      }
    });
  }

  it('any family, order to 10, edge, centre and output: meets H and conserves power [property]', () => {
    fc.assert(
      fc.property(
        fc.constantFrom(...FAMILIES),
        fc.integer({ min: 1, max: 10 }),
        fc.double({ min: 0.05, max: 0.95, noNaN: true }),
        fc.double({ min: -Math.PI, max: Math.PI, noNaN: true }),
        fc.constantFrom(...OUTPUTS),
        fc.boolean(),
        (family, order, edge, centreRad, output, high) => {
          const filter = rotateFilter(familyFilter(family, order, edge * Math.PI, high), centreRad);
          const { fieldError, powerError } = solved(filter, output, poleAwareGrid(filter.poles, 16));
          expect(fieldError).toBeLessThan(FIELD);
          expect(powerError).toBeLessThan(POWER);
        },
      ),
      { numRuns: 60, seed: 20260 },
    );
  });

  it('equal loss per unit delay gives H(z/a) exactly, poles and zeros drawn in by a [published: physics of uniform damping, Madsen and Zhao 1999, section 6.1, from memory]', () => {
    const filter = familyFilter('ELLIPTIC', 5, 0.3 * Math.PI, false);
    const pair = synthesiseAllPassPair(filter, 'OUT1');
    const a = 10 ** (-0.2 / 20);
    const damped = {
      zeros: filter.zeros.map((zero) => zero.mul(a)),
      poles: filter.poles.map((pole) => pole.mul(a)),
      gain: filter.gain.mul(new Complex(0, pair.constantPhaseRad).exp()),
    };
    const grid = poleAwareGrid(damped.poles, 64);
    const lossy = withLosses(pair.interferometer, { ringLossDb: 0.2, couplerExcessLossDb: 0 });
    const { re, im } = solveNetlist(netlistOf({ cells: [lossy], join: 'OUT1' }), grid).out1!;
    const wantedRe = new Float64Array(grid.length);
    const wantedIm = new Float64Array(grid.length);
    evaluateInto(damped, grid, wantedRe, wantedIm);
    re.forEach((value, k) => {
      expect(Math.hypot(value - wantedRe[k]!, im[k]! - wantedIm[k]!)).toBeLessThan(FIELD);
    });
  });

  it('an odd half-band has one ring with K = 1, a plain delay [published: Gazsi, IEEE Trans. CAS 32, 68 (1985)]', () => {
    const filter = designHalfBand({ family: 'BUTTERWORTH', order: 5 });
    const { interferometer } = synthesiseAllPassPair(filter, 'OUT2');
    const couplings = interferometer.arms.flatMap((arm) => arm.rings.map((ring) => ring.powerCrossCoupling));
    expect(couplings.filter((coupling) => coupling === 1)).toHaveLength(1);
  });
});

describe('what is refused as an all-pass pair', () => {
  const sound = familyFilter('ELLIPTIC', 4, 0.5 * Math.PI, false);

  it('labels that do not split the filter [property]', () => {
    const wrong = { ...sound, arms: [0, 0, 1, 1] as const };
    expect(() => synthesiseAllPassPair(wrong, 'OUT1')).toThrow(Refusal);
  });

  it('a pole on or outside the circle, or NaN [property]', () => {
    for (const bad of [new Complex(1, 0), new Complex(0, 1.2), new Complex(Number.NaN, 0)]) {
      const poles = [bad, ...sound.poles.slice(1)];
      expect(() => synthesiseAllPassPair({ ...sound, poles }, 'OUT1')).toThrow(Refusal);
    }
  });

  it('a ring at or under critical coupling, K ≤ 1 − a² [published: Bogaerts et al., LPR 6, 47 (2012), critical coupling r = a]', () => {
    const { interferometer } = synthesiseAllPassPair(sound, 'OUT2');
    const narrowest = Math.min(
      ...interferometer.arms.flatMap((arm) => arm.rings.map((ring) => ring.powerCrossCoupling)),
    );
    const criticalDb = -10 * Math.log10(1 - narrowest);
    const lossy = (ringLossDb: number) => [
      withLosses(interferometer, { ringLossDb, couplerExcessLossDb: 0 }),
    ];
    expect(() => refuseUndercoupled(lossy(criticalDb * 0.999))).not.toThrow();
    expect(() => refuseUndercoupled(lossy(criticalDb * 1.001))).toThrow(Refusal);
  });
});
