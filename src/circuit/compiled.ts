/**
 * Everything about a circuit that does not depend on frequency, in typed arrays: made once, refreshed in place.
 */
import type { CellJoin, CircuitParameters } from './circuit.ts';
import { amplitudeOf, RING_STRIDE, ringConstantsInto } from './elements.ts';
import {
  ARM_PARAMETER,
  CELL_PARAMETER,
  type CellLayout,
  layoutOf,
  parametersInto,
  RING_PARAMETER,
  sizeOf,
} from './parameters.ts';

/** Places in one cell's constants: the four products of its couplers' amplitudes, then three an arm. */
export const CELL_CONSTANT = {
  barBar: 0,
  crossCross: 1,
  barCross: 2,
  crossBar: 3,
  arm0: 4,
  arm1: 7,
} as const;
export const ARM_CONSTANT = { amplitude: 0, phaseRad: 1, delay: 2 } as const;
export const CELL_STRIDE = 10;

export const UNCOUPLED = 0;
export const ALL_PASS = 1;
export const LOSSY = 2;

export interface CompiledCell {
  /** Index of its first ring among all rings of the circuit. */
  readonly firstRing: number;
  readonly ringsPerArm: readonly [number, number];
}

export interface Compiled {
  readonly layout: readonly CellLayout[];
  readonly join: CellJoin;
  readonly parameters: Float64Array;
  readonly cells: readonly CompiledCell[];
  /** CELL_STRIDE numbers a cell. */
  readonly cellConstants: Float64Array;
  /** RING_STRIDE numbers a ring. */
  readonly ringConstants: Float64Array;
  /** UNCOUPLED, ALL_PASS or LOSSY, one a ring. */
  readonly ringKind: Uint8Array;
}

export function compile(circuit: CircuitParameters): Compiled {
  if (circuit.cells.length === 0) throw new RangeError('a circuit has at least one cell');
  const layout = layoutOf(circuit);
  let rings = 0;
  const cells = layout.map(({ ringsPerArm }) => {
    const firstRing = rings;
    rings += ringsPerArm[0] + ringsPerArm[1];
    return { firstRing, ringsPerArm };
  });
  const compiled: Compiled = {
    layout,
    join: circuit.join,
    parameters: new Float64Array(sizeOf(layout)),
    cells,
    cellConstants: new Float64Array(CELL_STRIDE * cells.length),
    ringConstants: new Float64Array(RING_STRIDE * rings),
    ringKind: new Uint8Array(rings),
  };
  parametersInto(compiled.parameters, layout, circuit);
  refresh(compiled);
  return compiled;
}

/** Recomputes the constants from `parameters`. Throws `RangeError` on a value that no passive circuit has. */
export function refresh(compiled: Compiled): void {
  for (let c = 0; c < compiled.cells.length; c++) refreshCell(compiled, c);
}

function inRange(value: number, least: number, most: number, what: string): number {
  if (value >= least && value <= most) return value;
  throw new RangeError(`${what} is ${value}, outside ${least}…${most}`);
}

function refreshCell(compiled: Compiled, c: number): void {
  const { parameters, cellConstants } = compiled;
  const { cellAt, armAt } = compiled.layout[c]!;
  const { firstRing, ringsPerArm } = compiled.cells[c]!;
  const kIn = inRange(parameters[cellAt + CELL_PARAMETER.inputCoupling]!, 0, 1, 'inputCoupling');
  const kOut = inRange(parameters[cellAt + CELL_PARAMETER.outputCoupling]!, 0, 1, 'outputCoupling');
  const excessDb = inRange(
    parameters[cellAt + CELL_PARAMETER.couplerExcessLossDb]!,
    0,
    Infinity,
    'couplerExcessLossDb',
  );
  const couplerAmplitude = amplitudeOf(2 * excessDb);
  const at = c * CELL_STRIDE;
  cellConstants[at + CELL_CONSTANT.barBar] = couplerAmplitude * Math.sqrt((1 - kIn) * (1 - kOut));
  cellConstants[at + CELL_CONSTANT.crossCross] = couplerAmplitude * Math.sqrt(kIn * kOut);
  cellConstants[at + CELL_CONSTANT.barCross] = couplerAmplitude * Math.sqrt((1 - kIn) * kOut);
  cellConstants[at + CELL_CONSTANT.crossBar] = couplerAmplitude * Math.sqrt(kIn * (1 - kOut));
  for (let arm = 0; arm < 2; arm++) {
    const from = armAt[arm]!;
    const to = at + (arm === 0 ? CELL_CONSTANT.arm0 : CELL_CONSTANT.arm1);
    const lossDb = inRange(parameters[from + ARM_PARAMETER.lossDb]!, 0, Infinity, 'lossDb');
    // every ring's coupler takes its excess loss once on the way through
    cellConstants[to + ARM_CONSTANT.amplitude] = amplitudeOf(lossDb + ringsPerArm[arm]! * excessDb);
    cellConstants[to + ARM_CONSTANT.phaseRad] = parameters[from + ARM_PARAMETER.phaseRad]!;
    cellConstants[to + ARM_CONSTANT.delay] = inRange(
      parameters[from + ARM_PARAMETER.delay]!,
      0,
      Infinity,
      'delay',
    );
  }
  for (let r = 0; r < ringsPerArm[0] + ringsPerArm[1]; r++)
    refreshRing(compiled, c, r, firstRing + r, excessDb);
}

function refreshRing(compiled: Compiled, cell: number, ring: number, index: number, excessDb: number): void {
  const { parameters } = compiled;
  const from = compiled.layout[cell]!.ringAt[ring]!;
  const coupling = inRange(parameters[from + RING_PARAMETER.powerCrossCoupling]!, 0, 1, 'powerCrossCoupling');
  const lossDb = inRange(parameters[from + RING_PARAMETER.lossDb]!, 0, Infinity, 'lossDb');
  const delay = inRange(parameters[from + RING_PARAMETER.delay]!, 0, Infinity, 'delay');
  const at = index * RING_STRIDE;
  const phaseRad = parameters[from + RING_PARAMETER.phaseRad]!;
  ringConstantsInto(compiled.ringConstants, at, coupling, phaseRad, lossDb, excessDb, delay);
  // an uncoupled ring only passes light by; its loop, lossless, would read 0/0 on resonance
  compiled.ringKind[index] = coupling === 0 ? UNCOUPLED : lossDb + excessDb === 0 ? ALL_PASS : LOSSY;
}
