/** Circuits: their parameters, the fast kernel, the netlist and the general solver that checks the kernel. */
export type {
  ArmParameters,
  CellJoin,
  CircuitParameters,
  InterferometerParameters,
  Netlist,
  NetlistElement,
  RingParameters,
} from './circuit.ts';
export { createDelayBuffers, type DelayBuffers, evaluateWithGroupDelayInto } from './group-delay.ts';
export {
  createFieldBuffers,
  createKernel,
  evaluateInto,
  type FieldBuffers,
  type Kernel,
  refreshKernel,
  updateKernel,
} from './kernel.ts';
export { netlistOf } from './netlist.ts';
export { ARM_PARAMETER, CELL_PARAMETER, type CellLayout, layoutOf, RING_PARAMETER } from './parameters.ts';
export { type ComplexSeries, NetlistSingular, solveNetlist } from './solver.ts';
export { type NetlistFault, NetlistInvalid } from './wiring.ts';
