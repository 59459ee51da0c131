/**
 * Curves, figures and compliance of filters whose answers are known: digital designs of SciPy 1.17.1 that agree with an
 * independent 60-digit computation (test/reference/circuit-filter-responses.json), and the definitions of the families.
 */
import { Complex } from 'complex.js';
import { describe, expect, it } from 'vitest';
import type { CircuitParameters } from '../../src/circuit/index.ts';
import {
  complianceOf,
  dispersionPsPerNm,
  figuresOf,
  gapsOf,
  reduceTo,
  sourceOfCircuit,
  sourceOfTransferFunction,
  spectrumOf,
  transmissionDb,
} from '../../src/response/index.ts';
import reference from '../reference/circuit-filter-responses.json' with { type: 'json' };

/** Invented: 1 pair of numbers easy to convert, 100 GHz per FSR and 10 ps per unit delay. */
const FSR_GHZ = 100;
const PS_PER_UNIT = 10;
/** The reference states 1e-10 of |H|; a level 100 dB down is then known to 1e-4 dB. */
const FIELD = 1e-10;
const DELAY = 1e-8;
/** Worst points and edges: 1e-6 dB, and what that is in GHz at the slope of these filters. */
const DB = 1e-6;
const EDGE_GHZ = 1e-7;

function designOf(id: string) {
  const entry = reference.entries.find((candidate) => candidate.id === id);
  if (entry === undefined) throw new Error(`no reference ${id}`);
  const roots = (list: number[][]) => list.map(([re, im]) => new Complex(re!, im!));
  const { zeros, poles, k } = entry.exact;
  const filter = { zeros: roots(zeros), poles: roots(poles), gain: new Complex(k, 0) };
  return { filter, response: entry.response, source: sourceOfTransferFunction(filter, FSR_GHZ) };
}

/** The circuit of the same filter: real and outer pair on one arm, inner pair on the other (fifth order). */
function circuitOf(id: string): CircuitParameters {
  const poles = designOf(id).filter.poles.toSorted((a, b) => Math.abs(b.im) - Math.abs(a.im));
  const arm = (list: typeof poles, phaseRad: number) => ({
    rings: list.map(({ re, im }) => ({
      powerCrossCoupling: 1 - re * re - im * im,
      phaseRad: -Math.atan2(im, re),
      lossDb: 0,
      delay: 1,
    })),
    delay: 0,
    lossDb: 0,
    phaseRad,
  });
  const arms = [arm([poles[0]!, poles[1]!, poles[4]!], 0), arm([poles[2]!, poles[3]!], Math.PI)] as const;
  const cell = { inputCoupling: 0.5, outputCoupling: 0.5, couplerExcessLossDb: 0, arms };
  return { cells: [cell], join: 'OUT1' };
}

const IDS = reference.entries.map(({ id }) => id);
const FIFTH_ORDER = [
  'butter-5-lowpass-0.25',
  'cheby1-5-lowpass-0.2-rp0.1',
  'ellip-5-lowpass-0.25-rp0.1-rs40',
];
const around = (halfGhz: number) => ({ lowGhz: -halfGhz, highGhz: halfGhz });

describe('curves', () => {
  it('of a transfer function are the published transmission and group delay [cross-check]', () => {
    for (const id of IDS) {
      const { source, response } = designOf(id);
      const offsets = Float64Array.from(response.w_over_pi, (overPi) => (overPi * FSR_GHZ) / 2);
      const spectrum = spectrumOf(source, offsets);
      const db = transmissionDb(spectrum);
      response.H.forEach(([re, im], i) => {
        expect(Math.hypot(spectrum.re[i]! - re!, spectrum.im[i]! - im!)).toBeLessThan(FIELD);
        const expected = response.mag_dB[i];
        if (expected !== null && expected !== undefined && expected > -60) {
          expect(Math.abs(db[i]! - expected)).toBeLessThan(DB);
          const delay = response.group_delay_samples[i]! * PS_PER_UNIT;
          expect(Math.abs(spectrum.groupDelayPs[i]! - delay)).toBeLessThan(DELAY * Math.abs(delay));
        }
        if (expected !== null && expected !== undefined && expected < -61)
          expect(spectrum.groupDelayPs[i]).toBeNaN();
      });
    }
  });

  it('of the circuit carry the same group delay, by another road [cross-check]', () => {
    for (const id of FIFTH_ORDER) {
      const { response } = designOf(id);
      const offsets = Float64Array.from(response.w_over_pi, (overPi) => (overPi * FSR_GHZ) / 2);
      const spectrum = spectrumOf(sourceOfCircuit(circuitOf(id), 'OUT2', FSR_GHZ), offsets);
      response.mag_dB.forEach((db, i) => {
        if (db === null || db < -60) return;
        const delay = response.group_delay_samples[i]! * PS_PER_UNIT;
        expect(Math.abs(spectrum.groupDelayPs[i]! - delay)).toBeLessThan(DELAY * delay);
      });
    }
  });

  it('name the runs of the grid where delay is undefined', () => {
    const { source } = designOf('ellip-9-lowpass-0.01-rp0.01-rs80');
    const offsets = Float64Array.from({ length: 201 }, (_, i) => -50 + 0.5 * i);
    const gaps = gapsOf(spectrumOf(source, offsets));
    expect(gaps).toHaveLength(2);
    expect(gaps[0]!.lowGhz).toBe(-50);
    expect(gaps[1]!.highGhz).toBe(50);
  });
});

describe('dispersion', () => {
  /** Central differences of the delay at 1e-4 GHz: their own error, h²·τ‴/6, is below this share. */
  const DIFFERENCE = 1e-6;

  it('is the derivative of the delay by vacuum wavelength, for circuits and transfer functions alike [cross-check]', () => {
    const referenceThz = 193.4;
    const step = 1e-4;
    const sources = [
      designOf('ellip-5-lowpass-0.25-rp0.1-rs40').source,
      sourceOfCircuit(circuitOf('ellip-5-lowpass-0.25-rp0.1-rs40'), 'OUT2', FSR_GHZ),
    ];
    for (const source of sources) {
      for (const offset of [-11, -4, 3, 9, 12]) {
        const at = spectrumOf(source, Float64Array.of(offset - step, offset, offset + step));
        // c as defined by the SI (BIPM, SI Brochure, 9th ed., 2019)
        const wavelengthNm = (x: number) => 299_792.458 / (referenceThz + x / 1000);
        const difference =
          (at.groupDelayPs[2]! - at.groupDelayPs[0]!) /
          (wavelengthNm(offset + step) - wavelengthNm(offset - step));
        const dispersion = dispersionPsPerNm(at, referenceThz)[1]!;
        expect(Math.abs(dispersion / difference - 1)).toBeLessThan(DIFFERENCE);
      }
    }
  });

  it('is positive where the delay grows with wavelength', () => {
    const { source } = designOf('butter-5-lowpass-0.25');
    // the delay of a low-pass filter peaks towards its edge: going from the centre to lower frequency it grows
    const [below] = dispersionPsPerNm(spectrumOf(source, Float64Array.of(-6)), 193.4);
    expect(below).toBeGreaterThan(0);
  });
});

describe('figures', () => {
  it('of a Butterworth filter: −3 dB width between the edges, no loss, no figure for its null [published]', () => {
    const { source } = designOf('butter-5-lowpass-0.25');
    const edge = 0.25 * (FSR_GHZ / 2);
    const figures = figuresOf(source, null, { passbands: [around(edge)], stopbands: [], centreGhz: 0 });
    expect(Math.abs(figures.insertionLossDb!)).toBeLessThan(DB);
    // definition of the family: −10·log₁₀2 dB at the edge
    expect(Math.abs(figures.rippleDb! - 10 * Math.log10(2))).toBeLessThan(DB);
    // |H|² = 1/(1 + (tan(Ω/2)/tan(Ωc/2))^2N), Butterworth 1930 by the bilinear transform
    const widthAt = (db: number) =>
      (2 * FSR_GHZ * Math.atan(Math.tan((0.25 * Math.PI) / 2) * (10 ** (db / 10) - 1) ** (1 / 10))) / Math.PI;
    expect(Math.abs(figures.bandwidth1DbGhz! - widthAt(1))).toBeLessThan(EDGE_GHZ);
    expect(Math.abs(figures.bandwidth3DbGhz! - widthAt(3))).toBeLessThan(EDGE_GHZ);
    expect(Math.abs(figures.bandwidth20DbGhz! - widthAt(20))).toBeLessThan(EDGE_GHZ);
    expect(Math.abs(figures.shapeFactor! - widthAt(20) / widthAt(1))).toBeLessThan(EDGE_GHZ);
    expect(figures.extinctionRatioDb).toBeNull();
    expect(figures.notDefined.map(({ figure }) => figure).toSorted()).toEqual([
      'extinctionRatioDb',
      'rejectionDb',
      'worstNeighbourIsolationDb',
    ]);
  });

  it('of elliptic and Chebyshev filters: the ripple and rejection they were designed for, narrow bands included [published]', () => {
    const cases = [
      { id: 'cheby1-5-lowpass-0.2-rp0.1', edge: 0.2, ripple: 0.1 },
      { id: 'ellip-5-lowpass-0.25-rp0.1-rs40', edge: 0.25, ripple: 0.1, stop: 40 },
      { id: 'ellip-9-lowpass-0.01-rp0.01-rs80', edge: 0.01, ripple: 0.01, stop: 80 },
    ];
    for (const { id, edge, ripple, stop } of cases) {
      const edgeGhz = (edge * FSR_GHZ) / 2;
      const { source } = designOf(id);
      const stopbands = [{ lowGhz: 1.5 * edgeGhz, highGhz: FSR_GHZ - 1.5 * edgeGhz }];
      const figures = figuresOf(source, null, { passbands: [around(edgeGhz)], stopbands, centreGhz: 0 });
      expect(Math.abs(figures.rippleDb! - ripple)).toBeLessThan(DB);
      // 1.5 edges lie beyond the stopband edge of these elliptic filters, whose worst rejection repeats at every lobe
      if (stop !== undefined) expect(Math.abs(figures.rejectionDb! - stop)).toBeLessThan(1e-5);
    }
  });

  it('of a circuit with a narrow resonance find what lies between the samples [published]', () => {
    // one lossy ring of K = 1e-4: least transmission ((t − a)/(1 − ta))² on resonance, full width of the notch at half
    // depth 4·asin((1 − ta)/(2√(ta))) (Bogaerts et al. 2012, from memory)
    const lossDb = 1e-4;
    const phaseRad = 0.123456789;
    const ring = { powerCrossCoupling: 1e-4, phaseRad, lossDb, delay: 1 };
    const empty = { rings: [], delay: 0, phaseRad: 0, lossDb: 0 };
    const cell = {
      inputCoupling: 0,
      outputCoupling: 0,
      couplerExcessLossDb: 0,
      arms: [{ ...empty, rings: [ring] }, empty] as const,
    };
    const source = sourceOfCircuit({ cells: [cell], join: 'OUT1' }, 'OUT1', FSR_GHZ);
    const t = Math.sqrt(1 - 1e-4);
    const a = 10 ** (-lossDb / 20);
    const depthDb = -20 * Math.log10(Math.abs((t - a) / (1 - t * a)));
    const whole = { passbands: [around(50)], stopbands: [], centreGhz: 0 };
    const figures = figuresOf(source, null, whole);
    // greatest transmission (t + a)/(1 + ta) opposite the resonance
    const peakDb = 20 * Math.log10((t + a) / (1 + t * a));
    expect(Math.abs(figures.extinctionRatioDb! - depthDb - peakDb)).toBeLessThan(DB);
    expect(Math.abs(figures.rippleDb! - depthDb - peakDb)).toBeLessThan(DB);
  });

  it('of an interleaver: isolation of the worse of its two windows, by power symmetry both alike [published]', () => {
    // half-band Butterworth of third order: poles 0 and ±j/√3, ring K = 2/3 twice and an arm of one delay (Vaidyanathan
    // 1987; test/reference/circuit-rings.json has the fifth orders)
    const ring = (phaseRad: number) => ({ powerCrossCoupling: 2 / 3, phaseRad, lossDb: 0, delay: 1 });
    const plain = { delay: 0, phaseRad: 0, lossDb: 0 };
    const arms = [
      { ...plain, rings: [ring(Math.PI / 2), ring(-Math.PI / 2)] },
      { ...plain, rings: [], delay: 1 },
    ] as const;
    const cell = { inputCoupling: 0.5, outputCoupling: 0.5, couplerExcessLossDb: 0, arms };
    const circuit: CircuitParameters = { cells: [cell], join: 'OUT1' };
    const out1 = sourceOfCircuit(circuit, 'OUT1', FSR_GHZ);
    const out2 = sourceOfCircuit(circuit, 'OUT2', FSR_GHZ);
    const half = 15;
    const passbands = [around(half)];
    const otherPassbands = [{ lowGhz: 50 - half, highGhz: 50 + half }];
    const figures = figuresOf(out2, out1, {
      passbands,
      stopbands: otherPassbands,
      otherPassbands,
      centreGhz: 0,
    });
    const swapped = figuresOf(out1, out2, {
      passbands: otherPassbands,
      stopbands: passbands,
      otherPassbands: passbands,
      centreGhz: 50,
    });
    // |H|² = 1/(1 + tan⁶(Ω/2)), its complement tan⁶/(1 + tan⁶): isolation −10·log₁₀ tan⁶ at the window's edge
    const isolation = -60 * Math.log10(Math.tan((Math.PI * half) / FSR_GHZ));
    expect(Math.abs(figures.worstNeighbourIsolationDb! - isolation)).toBeLessThan(DB);
    expect(Math.abs(swapped.worstNeighbourIsolationDb! - isolation)).toBeLessThan(DB);
  });

  it('are null with a reason where a span has no edge', () => {
    const { source } = designOf('butter-5-lowpass-0.25');
    const stopped = figuresOf(source, null, { passbands: [], stopbands: [], centreGhz: 40 });
    expect(stopped.bandwidth3DbGhz).toBeNull();
    expect(stopped.insertionLossDb).toBeNull();
    for (const { reason } of stopped.notDefined) expect(reason.length).toBeGreaterThan(10);
    expect(stopped.notDefined).toHaveLength(10);
  });
});

describe('compliance', () => {
  const { source } = designOf('ellip-5-lowpass-0.25-rp0.1-rs40');
  const sources = { OUT1: source, OUT2: source };
  const edge = 12.5;

  it('has no margin on the mask that the filter was designed for, and says where it touches [published]', () => {
    const compliance = complianceOf(sources, {
      reference: 'INPUT',
      bands: [
        { ...around(edge), minTransmissionDb: -0.1, output: 'OUT1' },
        { lowGhz: 20, highGhz: 80, maxTransmissionDb: -40, output: 'OUT2' },
      ],
    });
    expect(compliance.met).toBe(true);
    expect(Math.abs(compliance.bands[0]!.margin)).toBeLessThan(DB);
    expect(Math.abs(compliance.bands[1]!.margin)).toBeLessThan(1e-5);
    expect(compliance.worstMarginDb).toBe(Math.min(...compliance.bands.map(({ margin }) => margin)));
  });

  it('judges a line, a band wider than the FSR, and bands one FSR away alike', () => {
    const compliance = complianceOf(sources, {
      reference: 'INPUT',
      bands: [
        { lowGhz: 0, highGhz: 0, minTransmissionDb: -1, maxTransmissionDb: -0.5, output: 'OUT1' },
        { lowGhz: -500, highGhz: 900, maxTransmissionDb: -3, output: 'OUT1' },
        { lowGhz: FSR_GHZ - edge, highGhz: FSR_GHZ + edge, minTransmissionDb: -0.1, output: 'OUT1' },
      ],
    });
    expect(compliance.bands.map(({ quantity, met }) => [quantity, met])).toEqual([
      ['MIN_TRANSMISSION_DB', true],
      ['MAX_TRANSMISSION_DB', false],
      ['MAX_TRANSMISSION_DB', false],
      ['MIN_TRANSMISSION_DB', true],
    ]);
    expect(compliance.bands[2]!.margin).toBeCloseTo(-3, 6);
    expect(compliance.met).toBe(false);
  });

  it('counts levels from the peak when asked to', () => {
    const filter = designOf('ellip-5-lowpass-0.25-rp0.1-rs40').filter;
    const half = sourceOfTransferFunction({ ...filter, gain: filter.gain.mul(0.5) }, FSR_GHZ);
    const bands = [{ ...around(edge), minTransmissionDb: -0.1, output: 'OUT1' as const }];
    const judged = (reference: 'INPUT' | 'PEAK') =>
      complianceOf({ OUT1: half, OUT2: half }, { reference, bands });
    expect(Math.abs(judged('PEAK').worstMarginDb)).toBeLessThan(DB);
    expect(Math.abs(judged('INPUT').worstMarginDb + 20 * Math.log10(2))).toBeLessThan(DB);
  });
});

describe('reduced curves', () => {
  it('keep a notch of one sample, the ends and the count asked for', () => {
    const x = Float64Array.from({ length: 4001 }, (_, i) => i);
    const y = x.map((i) => (i === 1234 ? -60 : i === 3210 ? 3 : Math.sin(i / 100)));
    const reduced = reduceTo(x, y, 200);
    expect(reduced.x.length).toBeLessThanOrEqual(200);
    expect(reduced.x[0]).toBe(0);
    expect(reduced.x.at(-1)).toBe(4000);
    expect(reduced.y).toContain(-60);
    expect(reduced.x[reduced.y.indexOf(-60)]).toBe(1234);
    expect(reduced.x[reduced.y.indexOf(3)]).toBe(3210);
    expect([...reduced.x]).toEqual([...reduced.x].toSorted((a, b) => a - b));
  });

  it('keep gaps and short curves as they are', () => {
    const x = Float64Array.of(0, 1, 2, 3);
    expect(reduceTo(x, x, 10).y).toEqual(x);
    const gap = reduceTo(new Float64Array(100), new Float64Array(100).fill(Number.NaN), 10);
    expect(gap.y.every((value) => Number.isNaN(value))).toBe(true);
    expect(() => reduceTo(x, x, 3)).toThrow(RangeError);
  });
});
