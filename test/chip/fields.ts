/** Fields of circuits by the general solver, and the netlist of a chip as it is built: two real couplers in each tunable one. */
import { type ChipModel, innerCouplings } from '../../src/chip/index.ts';
import {
  type CircuitParameters,
  type ComplexSeries,
  type Netlist,
  type NetlistElement,
  netlistOf,
  solveNetlist,
} from '../../src/circuit/index.ts';

/** Ω that fall on no symmetry of the invented circuits. */
export const OMEGAS = Float64Array.from({ length: 61 }, (_, k) => -Math.PI + 0.0137 + (k * 2 * Math.PI) / 61);

export interface Outputs {
  readonly out1: ComplexSeries;
  readonly out2: ComplexSeries;
}

export function fieldsOf(circuit: CircuitParameters, omegas = OMEGAS): Outputs {
  return outputsOf(netlistOf(circuit), omegas);
}

export function outputsOf(netlist: Netlist, omegas = OMEGAS): Outputs {
  const solved = solveNetlist(netlist, omegas);
  return { out1: solved.out1!, out2: solved.out2! };
}

/** Largest field difference after the best constant phase between the two; `delay`: whole delays of `a` behind `b`. */
export function difference(a: ComplexSeries, b: ComplexSeries, delay = 0, omegas = OMEGAS): number {
  let re = 0;
  let im = 0;
  const turned = Array.from(omegas, (omega, k) => {
    const [c, s] = [Math.cos(omega * delay), -Math.sin(omega * delay)];
    return [b.re[k]! * c - b.im[k]! * s, b.re[k]! * s + b.im[k]! * c] as const;
  });
  turned.forEach(([bRe, bIm], k) => {
    re += a.re[k]! * bRe + a.im[k]! * bIm;
    im += a.im[k]! * bRe - a.re[k]! * bIm;
  });
  const size = Math.hypot(re, im);
  const [c, s] = size > 0 ? [re / size, im / size] : [1, 0];
  return turned.reduce(
    (worst, [bRe, bIm], k) =>
      Math.max(worst, Math.hypot(a.re[k]! - (bRe * c - bIm * s), a.im[k]! - (bRe * s + bIm * c))),
    0,
  );
}

/** Where the light of a coupler enters and leaves, whatever it is made of. */
interface Ends {
  readonly in1: string;
  readonly in2: string;
  readonly out1: string;
  readonly out2: string;
}

/** The chip as built, for phases of the driven elements in channel order (rad), with its losses. */
export function builtNetlist(chip: ChipModel, phasesRad: ArrayLike<number>): Netlist {
  const elements: NetlistElement[] = [];
  const connections: (readonly [string, string])[] = [];
  const phaseOf = (path: string) => phasesRad[chip.channels.findIndex(({ drives }) => drives === path)] ?? 0;
  const { unitDelayLossDb, couplerExcessLossDb } = chip.losses;
  const guide = (id: string, delay: number, phase: number) => {
    elements.push({ id, kind: 'waveguide', delay, phase, lossDb: unitDelayLossDb * delay });
  };
  const layCoupler = (cell: ChipModel['cells'][number], name: string): Ends => {
    const coupler = cell.couplers.find(({ element }) => element === name)!;
    const id = `${cell.name}.${name}`;
    if (!coupler.tunable) {
      const powerCrossCoupling = coupler.powerCrossCoupling!;
      elements.push({ id, kind: 'coupler', powerCrossCoupling, excessLossDb: couplerExcessLossDb });
      return { in1: `${id}.in1`, in2: `${id}.in2`, out1: `${id}.out1`, out2: `${id}.out2` };
    }
    const theta = phaseOf(`${id}.coupling`);
    const [first, second] = innerCouplings(coupler);
    elements.push(
      { id: `${id}.a`, kind: 'coupler', powerCrossCoupling: first, excessLossDb: couplerExcessLossDb / 2 },
      { id: `${id}.b`, kind: 'coupler', powerCrossCoupling: second, excessLossDb: couplerExcessLossDb / 2 },
    );
    guide(`${id}.upper`, 0, coupler.heatedArm === 'UPPER' ? theta : 0);
    guide(`${id}.lower`, 0, coupler.heatedArm === 'LOWER' ? theta : 0);
    connections.push(
      [`${id}.a.out1`, `${id}.upper.in`],
      [`${id}.a.out2`, `${id}.lower.in`],
      [`${id}.upper.out`, `${id}.b.in1`],
      [`${id}.lower.out`, `${id}.b.in2`],
    );
    return { in1: `${id}.a.in1`, in2: `${id}.a.in2`, out1: `${id}.b.out1`, out2: `${id}.b.out2` };
  };
  const ends = chip.cells.map((cell) => {
    const input = layCoupler(cell, 'input');
    const output = layCoupler(cell, 'output');
    let ring = 1;
    for (const arm of [0, 1] as const) {
      const armId = `${cell.name}.arm${arm}`;
      guide(armId, cell.armDelay[arm], arm === 1 ? phaseOf(`${cell.name}.arm.phase`) : 0);
      connections.push([arm === 0 ? input.out1 : input.out2, `${armId}.in`]);
      let end = `${armId}.out`;
      for (let k = 0; k < cell.ringsPerArm[arm]; k++, ring++) {
        const name = `ring${ring}`;
        const loop = `${cell.name}.${name}.loop`;
        const coupler = layCoupler(cell, name);
        guide(loop, cell.ringDelay, phaseOf(`${cell.name}.${name}.phase`));
        connections.push([end, coupler.in1], [coupler.out2, `${loop}.in`], [`${loop}.out`, coupler.in2]);
        end = coupler.out1;
      }
      connections.push([end, arm === 0 ? output.in1 : output.in2]);
    }
    return { input, output };
  });
  ends.slice(1).forEach(({ input }, k) => {
    const before = ends[k]!.output;
    if (chip.join !== 'OUT2') connections.push([before.out1, input.in1]);
    if (chip.join === 'OUT2') connections.push([before.out2, input.in1]);
    if (chip.join === 'BOTH') connections.push([before.out2, input.in2]);
  });
  const last = ends.at(-1)!.output;
  const { in1, in2 } = ends[0]!.input;
  return { elements, connections, ports: { in1, in2, out1: last.out1, out2: last.out2 } };
}
