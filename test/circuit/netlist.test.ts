import { describe, expect, it } from 'vitest';
import {
  ARM_PARAMETER,
  CELL_PARAMETER,
  type CircuitParameters,
  createFieldBuffers,
  createKernel,
  evaluateInto,
  layoutOf,
  type Netlist,
  NetlistInvalid,
  NetlistSingular,
  netlistOf,
  RING_PARAMETER,
  refreshKernel,
  solveNetlist,
} from '../../src/circuit/index.ts';

const ring = { powerCrossCoupling: 0.4, phaseRad: 0.3, lossDb: 0.1, delay: 1 };
const arm = { rings: [ring], delay: 1, phaseRad: 0.2, lossDb: 0 };
const cell = {
  inputCoupling: 0.5,
  outputCoupling: 0.4,
  couplerExcessLossDb: 0.05,
  arms: [arm, arm] as const,
};
const circuit: CircuitParameters = { cells: [cell, cell], join: 'OUT2' };

const loop: Netlist = {
  elements: [
    { id: 'c', kind: 'coupler', powerCrossCoupling: 0, excessLossDb: 0 },
    { id: 'w', kind: 'waveguide', delay: 1, phase: 0, lossDb: 0 },
  ],
  connections: [
    ['c.out2', 'w.in'],
    ['w.out', 'c.in2'],
  ],
  ports: { in1: 'c.in1', out1: 'c.out1' },
};

function faultOf(netlist: Netlist, input?: string): string {
  try {
    solveNetlist(netlist, Float64Array.of(0.1), input);
  } catch (error) {
    if (error instanceof NetlistInvalid) return `${error.fault} ${error.where}`;
    throw error;
  }
  return 'none';
}

describe('netlist export', () => {
  it('names every element after its cell and numbers rings through the cell', () => {
    const { elements, ports } = netlistOf(circuit, ['left', 'right']);
    expect(elements.slice(0, 8).map(({ id }) => id)).toEqual([
      'left.input',
      'left.arm0',
      'left.ring1.coupler',
      'left.ring1.loop',
      'left.arm1',
      'left.ring2.coupler',
      'left.ring2.loop',
      'left.output',
    ]);
    expect(ports).toEqual({
      in1: 'left.input.in1',
      in2: 'left.input.in2',
      out1: 'right.output.out1',
      out2: 'right.output.out2',
    });
  });

  it('joins by the guide that the circuit names and leaves the other open', () => {
    const { connections } = netlistOf(circuit);
    expect(connections).toContainEqual(['cell1.output.out2', 'cell2.input.in1']);
    expect(connections.flat()).not.toContain('cell1.output.out1');
  });

  it('is symmetric: light into in2 of a lossless cell conserves power too [property]', () => {
    const lossless: CircuitParameters = {
      join: 'BOTH',
      cells: [
        {
          ...cell,
          couplerExcessLossDb: 0,
          arms: [
            { ...arm, rings: [{ ...ring, lossDb: 0 }] },
            { ...arm, rings: [] },
          ],
        },
      ],
    };
    const { out1, out2 } = solveNetlist(netlistOf(lossless), Float64Array.of(0.7), 'in2');
    const power = out1!.re[0]! ** 2 + out1!.im[0]! ** 2 + out2!.re[0]! ** 2 + out2!.im[0]! ** 2;
    expect(power).toBeCloseTo(1, 13);
  });
});

describe('netlist solver', () => {
  it('refuses what does not hang together and says where', () => {
    const with_ = (connections: [string, string][]): Netlist => ({ ...loop, connections });
    expect(faultOf(with_([['x.out', 'c.in2']]))).toBe('UNKNOWN_ELEMENT x.out');
    expect(faultOf(with_([['w.out', 'c.in3']]))).toBe('UNKNOWN_PORT c.in3');
    expect(faultOf(with_([['w.in', 'c.in2']]))).toBe('WRONG_DIRECTION w.in');
    expect(faultOf(with_([...(loop.connections as [string, string][]), ['c.out1', 'c.in2']]))).toBe(
      'PORT_USED_TWICE c.in2',
    );
    expect(faultOf({ ...loop, elements: [...loop.elements, loop.elements[0]!] })).toBe('DUPLICATE_ELEMENT c');
    expect(faultOf(loop, 'in9')).toBe('NO_SUCH_INPUT in9');
    const gain = { id: 'g', kind: 'waveguide', delay: 1, phase: 0, lossDb: -1 } as const;
    expect(faultOf({ ...loop, elements: [...loop.elements, gain] })).toBe('VALUE_OUT_OF_RANGE g.lossDb');
    const beyond = { id: 'g', kind: 'coupler', powerCrossCoupling: 1.1, excessLossDb: 0 } as const;
    expect(faultOf({ ...loop, elements: [...loop.elements, beyond] })).toBe(
      'VALUE_OUT_OF_RANGE g.powerCrossCoupling',
    );
  });

  it('refuses a lossless loop that nothing couples, on its resonance only', () => {
    expect(() => solveNetlist(loop, Float64Array.of(0))).toThrow(NetlistSingular);
    expect(() => solveNetlist(loop, Float64Array.of(2 * Math.PI))).toThrow(NetlistSingular);
    expect(solveNetlist(loop, Float64Array.of(1)).out1!.re[0]).toBe(1);
  });

  it('solves a coupler fed back across itself, which the kernel has no form for [cross-check]', () => {
    // out2 returns to in1: the loop passes the coupler crossed, so a round trip is −j√K·e. Expected values below are the
    // coupler's two equations (src/conventions.ts) solved by hand.
    const k = 0.9;
    const crossed: Netlist = {
      elements: [
        { id: 'a', kind: 'coupler', powerCrossCoupling: k, excessLossDb: 0 },
        { id: 'w', kind: 'waveguide', delay: 1, phase: 0, lossDb: 0 },
      ],
      connections: [
        ['a.out2', 'w.in'],
        ['w.out', 'a.in1'],
      ],
      ports: { in1: 'a.in2', out1: 'a.out1' },
    };
    const { out1 } = solveNetlist(crossed, Float64Array.of(0.4));
    // out1 = −j√K·in2 + t·e·out2, out2 = t·in2 − j√K·e·out2
    const t = Math.sqrt(1 - k);
    const s = Math.sqrt(k);
    const e = { re: Math.cos(0.4), im: -Math.sin(0.4) };
    const denominator = { re: 1 - s * e.im, im: s * e.re };
    const norm = denominator.re ** 2 + denominator.im ** 2;
    const inner = { re: (t * denominator.re) / norm, im: (-t * denominator.im) / norm };
    const re = t * (e.re * inner.re - e.im * inner.im);
    const im = -s + t * (e.re * inner.im + e.im * inner.re);
    expect(Math.hypot(out1!.re[0]! - re, out1!.im[0]! - im)).toBeLessThan(1e-15 * 10);
    expect(Math.hypot(re, im)).toBeCloseTo(1, 13);
  });
});

describe('kernel parameters', () => {
  it('refuse what no passive circuit has', () => {
    const bad = (change: object): CircuitParameters => ({ join: 'OUT1', cells: [{ ...cell, ...change }] });
    expect(() => createKernel(bad({ inputCoupling: 1.01 }))).toThrow(RangeError);
    expect(() => createKernel(bad({ outputCoupling: Number.NaN }))).toThrow(RangeError);
    expect(() => createKernel(bad({ couplerExcessLossDb: -0.1 }))).toThrow(RangeError);
    expect(() => createKernel({ join: 'OUT1', cells: [] })).toThrow(RangeError);
    const kernel = createKernel(circuit);
    kernel.parameters[layoutOf(circuit)[1]!.cellAt + CELL_PARAMETER.outputCoupling] = 2;
    expect(() => refreshKernel(kernel)).toThrow(RangeError);
  });

  it('are written in place by an optimiser and then hold as if the circuit had been made so [cross-check]', () => {
    const kernel = createKernel(circuit);
    const { ringAt, armAt } = layoutOf(circuit)[1]!;
    kernel.parameters[ringAt[1]! + RING_PARAMETER.powerCrossCoupling] = 0.9;
    kernel.parameters[ringAt[1]! + RING_PARAMETER.phaseRad] = -1;
    kernel.parameters[armAt[0] + ARM_PARAMETER.phaseRad] = 2;
    refreshKernel(kernel);
    const changed: CircuitParameters = {
      ...circuit,
      cells: [
        cell,
        {
          ...cell,
          arms: [
            { ...arm, phaseRad: 2 },
            { ...arm, rings: [{ ...ring, powerCrossCoupling: 0.9, phaseRad: -1 }] },
          ],
        },
      ],
    };
    const out = createFieldBuffers(1);
    evaluateInto(kernel, Float64Array.of(0.7), out);
    const { out1, out2 } = solveNetlist(netlistOf(changed), Float64Array.of(0.7));
    expect(Math.hypot(out.out1Re[0]! - out1!.re[0]!, out.out1Im[0]! - out1!.im[0]!)).toBeLessThan(1e-14);
    expect(Math.hypot(out.out2Re[0]! - out2!.re[0]!, out.out2Im[0]! - out2!.im[0]!)).toBeLessThan(1e-14);
  });

  it('give not-a-number for a frequency that is not one, and the rest of the grid unharmed', () => {
    const omega = Float64Array.from({ length: 600 }, (_, i) => (i === 300 ? Number.NaN : i * 0.01));
    const out = createFieldBuffers(600);
    evaluateInto(createKernel(circuit), omega, out);
    expect(out.out1Re[300]).toBeNaN();
    expect(out.out1Re.filter((x) => Number.isNaN(x))).toHaveLength(1);
  });

  it('hold for angles beyond the vector sine, where the exact form takes over [cross-check]', () => {
    const omega = Float64Array.of(3e6, -5e7);
    const out = createFieldBuffers(2);
    evaluateInto(createKernel(circuit), omega, out);
    const { out1 } = solveNetlist(netlistOf(circuit), omega);
    expect(Math.abs(out.out1Re[0]! - out1!.re[0]!)).toBeLessThan(1e-12);
    expect(Math.abs(out.out1Im[1]! - out1!.im[1]!)).toBeLessThan(1e-12);
  });
});
