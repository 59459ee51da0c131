/** A circuit as a flat signal-flow netlist, so that anyone can check it with a solver of their own. */
import type {
  ArmParameters,
  CircuitParameters,
  InterferometerParameters,
  Netlist,
  NetlistElement,
} from './circuit.ts';

interface Draft {
  readonly elements: NetlistElement[];
  readonly connections: (readonly [string, string])[];
}

function addCoupler(draft: Draft, id: string, powerCrossCoupling: number, excessLossDb: number): void {
  draft.elements.push({ id, kind: 'coupler', powerCrossCoupling, excessLossDb });
}

/** Lays one arm from port `from` and returns the port where it ends. */
function addArm(
  draft: Draft,
  cellName: string,
  cell: InterferometerParameters,
  arm: ArmParameters,
  armName: string,
  firstRing: number,
  from: string,
): string {
  const id = `${cellName}.${armName}`;
  draft.elements.push({ id, kind: 'waveguide', delay: arm.delay, phase: arm.phaseRad, lossDb: arm.lossDb });
  draft.connections.push([from, `${id}.in`]);
  let end = `${id}.out`;
  arm.rings.forEach((ring, i) => {
    const ringId = `${cellName}.ring${firstRing + i}`;
    const coupler = `${ringId}.coupler`;
    const loop = `${ringId}.loop`;
    addCoupler(draft, coupler, ring.powerCrossCoupling, cell.couplerExcessLossDb);
    draft.elements.push({
      id: loop,
      kind: 'waveguide',
      delay: ring.delay,
      phase: ring.phaseRad,
      lossDb: ring.lossDb,
    });
    draft.connections.push(
      [end, `${coupler}.in1`],
      [`${coupler}.out2`, `${loop}.in`],
      [`${loop}.out`, `${coupler}.in2`],
    );
    end = `${coupler}.out1`;
  });
  return end;
}

function addCell(draft: Draft, name: string, cell: InterferometerParameters): void {
  addCoupler(draft, `${name}.input`, cell.inputCoupling, cell.couplerExcessLossDb);
  const [upper, lower] = cell.arms;
  const upperEnd = addArm(draft, name, cell, upper, 'arm0', 1, `${name}.input.out1`);
  const lowerEnd = addArm(draft, name, cell, lower, 'arm1', 1 + upper.rings.length, `${name}.input.out2`);
  addCoupler(draft, `${name}.output`, cell.outputCoupling, cell.couplerExcessLossDb);
  draft.connections.push([upperEnd, `${name}.output.in1`], [lowerEnd, `${name}.output.in2`]);
}

/**
 * Elements are named `<cell>.input`, `<cell>.arm0`, `<cell>.ring1.coupler`, `<cell>.ring1.loop`, …, `<cell>.output`;
 * rings are numbered through the cell, arm 0 first. An output that ends in an absorber between two cells stays open.
 * @param names one a cell; `cell1`, `cell2`, … when absent
 */
export function netlistOf(circuit: CircuitParameters, names?: readonly string[]): Netlist {
  const nameOf = (i: number) => names?.[i] ?? `cell${i + 1}`;
  const draft: Draft = { elements: [], connections: [] };
  circuit.cells.forEach((cell, i) => {
    addCell(draft, nameOf(i), cell);
    if (i === 0) return;
    const before = `${nameOf(i - 1)}.output`;
    const here = `${nameOf(i)}.input`;
    if (circuit.join === 'OUT2') draft.connections.push([`${before}.out2`, `${here}.in1`]);
    else draft.connections.push([`${before}.out1`, `${here}.in1`]);
    if (circuit.join === 'BOTH') draft.connections.push([`${before}.out2`, `${here}.in2`]);
  });
  const last = `${nameOf(circuit.cells.length - 1)}.output`;
  const first = `${nameOf(0)}.input`;
  return {
    ...draft,
    ports: { in1: `${first}.in1`, in2: `${first}.in2`, out1: `${last}.out1`, out2: `${last}.out2` },
  };
}
