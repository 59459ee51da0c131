/**
 * Kernel and solver against values from outside: closed forms of single rings, all-pass sums, perturbed responses and
 * feed-forward lattices. Sources stand in the reference files and are repeated in the titles.
 */
import { Complex } from 'complex.js';
import { describe, expect, it } from 'vitest';
import {
  type ArmParameters,
  type CircuitParameters,
  createDelayBuffers,
  createFieldBuffers,
  createKernel,
  evaluateInto,
  evaluateWithGroupDelayInto,
  type Netlist,
  type NetlistElement,
  solveNetlist,
} from '../../src/circuit/index.ts';
import { evaluateInto as evaluateFilterInto } from '../../src/filter/index.ts';
import filterReference from '../reference/circuit-filter-responses.json' with { type: 'json' };
import latticeReference from '../reference/circuit-lattices.json' with { type: 'json' };
import ringReference from '../reference/circuit-rings.json' with { type: 'json' };

/** Relative, as the reference states for its closed forms. */
const CLOSED_FORM = 1e-10;
/** Absolute, of complex H, as the reference states. */
const FIELD = 1e-10;
/** dB, as the reference states. */
const PERTURBED_DB = 1e-7;
/** Absolute, of power, as the reference states for closed forms of lattices. */
const LATTICE_POWER = 1e-9;
/** The design's own acceptance of "equal loss gives const·H(z/a)". */
const UNIFORM_LOSS = 1e-9;

interface Entry {
  readonly id: string;
  readonly values: unknown;
  readonly [key: string]: unknown;
}

function entryOf(reference: { entries: readonly unknown[] }, id: string): Entry {
  const entry = (reference.entries as readonly Entry[]).find((candidate) => candidate.id === id);
  if (entry === undefined) throw new Error(`no reference ${id}`);
  return entry;
}

const ring = (powerCrossCoupling: number, phaseRad = 0, lossDb = 0) => ({
  powerCrossCoupling,
  phaseRad,
  lossDb,
  delay: 1,
});
const plainArm = (rings: ArmParameters['rings'], phaseRad = 0): ArmParameters => ({
  rings,
  phaseRad,
  delay: 0,
  lossDb: 0,
});

/** All light through arm 0: couplers that do not couple. */
function alone(arm: ArmParameters): CircuitParameters {
  const cell = {
    inputCoupling: 0,
    outputCoupling: 0,
    couplerExcessLossDb: 0,
    arms: [arm, plainArm([])] as const,
  };
  return { cells: [cell], join: 'OUT1' };
}

/** Sum (out2) and difference (out1) of two arms of rings. */
function sumOfArms(arm0: ArmParameters, arm1: ArmParameters): CircuitParameters {
  const cell = {
    inputCoupling: 0.5,
    outputCoupling: 0.5,
    couplerExcessLossDb: 0,
    arms: [arm0, arm1] as const,
  };
  return { cells: [cell], join: 'OUT1' };
}

function fields(circuit: CircuitParameters, omegaRad: readonly number[]) {
  const out = createFieldBuffers(omegaRad.length);
  evaluateInto(createKernel(circuit), Float64Array.from(omegaRad), out);
  return out;
}

describe('single rings', () => {
  interface AllPassRow {
    K: number;
    loss_dB_per_turn: number;
    samples: [number, number][];
    gd_peak_turns: number;
    gd_min_turns: number;
  }
  const rows = entryOf(ringReference, 'ring.allpass').values as AllPassRow[];

  it('transmit as the closed form of Bogaerts et al. 2012, from memory, says [cross-check]', () => {
    for (const { K, loss_dB_per_turn: lossDb, samples } of rows) {
      const omega = samples.map(([overPi]) => overPi * Math.PI);
      const out = fields(alone(plainArm([ring(K, 0, lossDb)])), omega);
      samples.forEach(([, expected], i) => {
        const power = out.out1Re[i]! ** 2 + out.out1Im[i]! ** 2;
        // the all but critically coupled ring leaves 5e-14 of the light: a difference of numbers printed to 17 digits
        expect(Math.abs(power - expected)).toBeLessThan(CLOSED_FORM * expected + 1e-19);
      });
    }
  });

  it('delay as the closed form says, on and off resonance, lossy rings of negative delay included [cross-check]', () => {
    for (const { K, loss_dB_per_turn: lossDb, gd_peak_turns: peak, gd_min_turns: least } of rows) {
      const delays = createDelayBuffers(2);
      const kernel = createKernel(alone(plainArm([ring(K, 0, lossDb)])));
      evaluateWithGroupDelayInto(kernel, Float64Array.of(0, Math.PI), createFieldBuffers(2), delays);
      // next to critical coupling the delay is one over a difference that the printed K fixes to 1e-7 only
      const tolerance = Math.abs(peak) > 1e6 ? 1e-5 : CLOSED_FORM;
      expect(Math.abs(delays.delay1[0]! / peak - 1)).toBeLessThan(tolerance);
      expect(Math.abs(delays.delay1[1]! / least - 1)).toBeLessThan(CLOSED_FORM);
    }
  });
});

describe('rings between two guides', () => {
  const half = (id: string, lossDb: number): NetlistElement => ({
    id,
    kind: 'waveguide',
    delay: 0.5,
    phase: 0,
    lossDb: lossDb / 2,
  });
  const addDrop = (k1: number, k2: number, lossDb: number): Netlist => ({
    elements: [
      { id: 'bus', kind: 'coupler', powerCrossCoupling: k1, excessLossDb: 0 },
      { id: 'drop', kind: 'coupler', powerCrossCoupling: k2, excessLossDb: 0 },
      half('up', lossDb),
      half('down', lossDb),
    ],
    connections: [
      ['bus.out2', 'up.in'],
      ['up.out', 'drop.in1'],
      ['drop.out1', 'down.in'],
      ['down.out', 'bus.in2'],
    ],
    ports: { in1: 'bus.in1', out1: 'bus.out1', out2: 'drop.out2' },
  });

  it('drop and pass as the closed forms of Bogaerts et al. 2012, from memory, say [cross-check]', () => {
    interface Row {
      K1: number;
      K2: number;
      loss_dB_per_turn: number;
      samples: [number, number, number][];
    }
    for (const { K1, K2, loss_dB_per_turn: lossDb, samples } of entryOf(ringReference, 'ring.add_drop')
      .values as Row[]) {
      const omega = Float64Array.from(samples, ([overPi]) => overPi * Math.PI);
      const { out1, out2 } = solveNetlist(addDrop(K1, K2, lossDb), omega);
      samples.forEach(([, through, drop], i) => {
        expect(Math.abs(out1!.re[i]! ** 2 + out1!.im[i]! ** 2 - through)).toBeLessThan(CLOSED_FORM);
        expect(Math.abs(out2!.re[i]! ** 2 + out2!.im[i]! ** 2 - drop)).toBeLessThan(CLOSED_FORM);
      });
    }
  });

  it('have half their light at the exact half width sin(πB/2FSR) = K/(2√(1−K)) [cross-check]', () => {
    interface Row {
      K: number;
      B_over_FSR: number;
    }
    for (const { K, B_over_FSR: width } of entryOf(ringReference, 'coupled_rings.single_exact')
      .values as Row[]) {
      const { out2 } = solveNetlist(addDrop(K, K, 0), Float64Array.of(Math.PI * width));
      expect(Math.abs(out2!.re[0]! ** 2 + out2!.im[0]! ** 2 - 0.5)).toBeLessThan(CLOSED_FORM);
    }
  });
});

describe('sums of ring arms', () => {
  interface Arm {
    pole: [number, number];
    K: number;
    phase_rad: number;
  }
  const ids = [
    'allpass.cheby1-5-0.2-lowpass-0.1',
    'allpass.butter-4-0.25',
    'allpass.ellip-7-0.2-lowpass-0.1-60',
  ];

  it('are the filters that Vaidyanathan, Mitra and Neuvo 1986 decompose [cross-check]', () => {
    for (const id of ids) {
      const entry = entryOf(ringReference, id);
      const values = entry.values as { arm0: Arm[]; arm1: Arm[]; phase0: number; phase1: number };
      const armOf = (rings: Arm[], phase: number) =>
        plainArm(
          rings.map(({ K, phase_rad: phi }) => ring(K, phi)),
          -phase,
        );
      const circuit = sumOfArms(armOf(values.arm0, values.phase0), armOf(values.arm1, values.phase1));
      const samples = entry.H_samples as [number, number, number][];
      const out = fields(
        circuit,
        samples.map(([overPi]) => overPi * Math.PI),
      );
      samples.forEach(([, re, im], i) => {
        // out2 is −j times the sum
        expect(Math.hypot(-out.out2Im[i]! - re, out.out2Re[i]! - im)).toBeLessThan(FIELD);
      });
    }
  });

  const elliptic = entryOf(filterReference, 'ellip-5-lowpass-0.25-rp0.1-rs40') as unknown as {
    exact: { zeros: [number, number][]; poles: [number, number][]; k: number };
  };
  const poles = elliptic.exact.poles;
  /** Sorted by angle in the s-plane the five poles alternate: real and outer pair against inner pair. */
  const arms = [
    [poles[4]!, poles[1]!, poles[0]!],
    [poles[3]!, poles[2]!],
  ] as const;

  it('respond to K and phase errors as computed in 60 digits for a fifth-order elliptic filter [cross-check]', () => {
    interface Row {
      dK_over_K: number;
      phase_error_rad: number;
      mag_dB: [number, number][];
    }
    for (const row of entryOf(ringReference, 'allpass.perturbed_response').values as Row[]) {
      const [arm0, arm1] = arms.map((list, arm) =>
        plainArm(
          // in each arm by (|pole|, Im pole); the phase error is + for even (ring + arm)
          list.map(([re, im], i) => {
            const k = (1 - re * re - im * im) * (1 + row.dK_over_K);
            return ring(k, -Math.atan2(im, re) + ((i + arm) % 2 === 0 ? 1 : -1) * row.phase_error_rad);
          }),
          arm === 0 ? 0 : Math.PI,
        ),
      );
      const samples = row.mag_dB;
      const out = fields(
        sumOfArms(arm0!, arm1!),
        samples.map(([overPi]) => overPi * Math.PI),
      );
      samples.forEach(([, expected], i) => {
        const db = 10 * Math.log10(out.out2Re[i]! ** 2 + out.out2Im[i]! ** 2);
        if (expected < -300) expect(db).toBeLessThan(-250);
        else expect(Math.abs(db - expected)).toBeLessThan(PERTURBED_DB);
      });
    }
  });

  it('with equal loss per turn are exactly H(z/a) [cross-check with the zeros and poles of the reference design]', () => {
    const lossDb = 0.4;
    const a = 10 ** (-lossDb / 20);
    const omega = Array.from({ length: 101 }, (_, i) => -Math.PI + (2 * Math.PI * i) / 100);
    const [arm0, arm1] = arms.map((list, arm) =>
      plainArm(
        list.map(([re, im]) => ring(1 - re * re - im * im, -Math.atan2(im, re), lossDb)),
        arm === 0 ? 0 : Math.PI,
      ),
    );
    const out = fields(sumOfArms(arm0!, arm1!), omega);
    const scaled = (roots: [number, number][]) => roots.map(([re, im]) => new Complex(a * re, a * im));
    const re = new Float64Array(101);
    const im = new Float64Array(101);
    const filter = {
      zeros: scaled(elliptic.exact.zeros),
      poles: scaled(poles),
      gain: new Complex(elliptic.exact.k, 0),
    };
    evaluateFilterInto(filter, Float64Array.from(omega), re, im);
    const size = (i: number) => Math.hypot(out.out2Re[i]!, out.out2Im[i]!);
    omega.forEach((_, i) => {
      expect(Math.abs(size(i) - Math.hypot(re[i]!, im[i]!))).toBeLessThan(UNIFORM_LOSS);
    });
  });
});

describe('feed-forward lattices', () => {
  interface Stage {
    readonly delay: number;
    readonly phase: number;
  }
  /** A positive delay is on the upper guide, a negative one the same delay on the lower. */
  function lattice(k: readonly number[], delays: readonly Stage[]): Netlist {
    const elements: NetlistElement[] = k.map((powerCrossCoupling, i) => ({
      id: `c${i}`,
      kind: 'coupler',
      powerCrossCoupling,
      excessLossDb: 0,
    }));
    const connections: [string, string][] = [];
    delays.forEach(({ delay, phase }, i) => {
      const [late, early] = delay >= 0 ? [1, 2] : [2, 1];
      elements.push({ id: `d${i}`, kind: 'waveguide', delay: Math.abs(delay), phase, lossDb: 0 });
      connections.push(
        [`c${i}.out${late}`, `d${i}.in`],
        [`d${i}.out`, `c${i + 1}.in${late}`],
        [`c${i}.out${early}`, `c${i + 1}.in${early}`],
      );
    });
    const last = `c${k.length - 1}`;
    return { elements, connections, ports: { in1: 'c0.in1', out1: `${last}.out1`, out2: `${last}.out2` } };
  }
  interface Samples {
    w_over_pi: number[];
    bar_power: number[];
    cross_power: number[];
  }

  function check(netlist: Netlist, samples: Samples) {
    const omega = Float64Array.from(samples.w_over_pi, (overPi) => overPi * Math.PI);
    const { out1, out2 } = solveNetlist(netlist, omega);
    omega.forEach((_, i) => {
      expect(Math.abs(out1!.re[i]! ** 2 + out1!.im[i]! ** 2 - samples.bar_power[i]!)).toBeLessThan(
        LATTICE_POWER,
      );
      expect(Math.abs(out2!.re[i]! ** 2 + out2!.im[i]! ** 2 - samples.cross_power[i]!)).toBeLessThan(
        LATTICE_POWER,
      );
    });
  }

  it('of one stage follow the closed form of the unbalanced interferometer [cross-check]', () => {
    const rows = entryOf(latticeReference, 'mzi.single.closed_form').values as {
      K: number[];
      metrics: { samples: Samples };
    }[];
    for (const { K, metrics } of rows) check(lattice(K, [{ delay: 1, phase: 0 }]), metrics.samples);
  });

  it('of several stages are the maximally flat filters of Jinguji and Oguma 2000 and the flat-top set [cross-check]', () => {
    for (const id of [
      'mzi.order3.0.5_0.2_0.2_0.04',
      'lattice.maxflat2.delays_1_2',
      'lattice.maxflat4.delays_1_2_2',
    ]) {
      const entry = entryOf(latticeReference, id);
      const delays = (entry.delays as [number, number][]).map(([delay, phase]) => ({ delay, phase }));
      check(lattice(entry.K as number[], delays), (entry.values as { samples: Samples }).samples);
    }
  });
});
