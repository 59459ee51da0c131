/**
 * The fast kernel: both outputs of a cascade of ring-loaded interferometers, light into in1, over any list of Ω.
 *
 * Frequencies go in blocks. Sine and cosine of Ω/2 are computed once a frequency and shared by all rings through the
 * addition theorem; arms are *products of rings* (expanded polynomials lose all digits on narrow bands). The addition
 * theorem costs a narrow ring its accuracy next to its resonance only: those few frequencies are done again one by one
 * by the exact form of src/circuit/point.ts.
 */
import type { BlockRoutines } from './blocks.ts';
import { BLOCK, HEAP_RING } from './blocks.ts';
import type { CircuitParameters } from './circuit.ts';
import {
  ALL_PASS,
  ARM_CONSTANT,
  CELL_CONSTANT,
  CELL_STRIDE,
  type Compiled,
  compile,
  LOSSY,
  refresh,
} from './compiled.ts';
import { RING_CONSTANT, RING_STRIDE } from './elements.ts';
import { fillTables, prepareEvenGrid } from './half-angles.ts';
import { parametersInto } from './parameters.ts';
import { createPlan, HEAP, MOST_RINGS, type Plan, planInto } from './plan.ts';
import { createPointWorkspace, evaluatePoint, type PointWorkspace } from './point.ts';
import { blockRoutines } from './routines.ts';

export interface FieldBuffers {
  readonly out1Re: Float64Array;
  readonly out1Im: Float64Array;
  readonly out2Re: Float64Array;
  readonly out2Im: Float64Array;
}

/**
 * Rings multiplied before one division: outside their exact windows 64 denominators of 0.01 make 1e-128, whose square is
 * still a number.
 */
const MOST_RUN = 64;

/** A compiled circuit. Not to be shared between threads; evaluations of different kernels may alternate freely. */
export interface Kernel {
  /**
   * The circuit's numbers in the order of src/circuit/parameters.ts. Whoever writes here calls `refreshKernel` before
   * the next evaluation.
   */
  readonly parameters: Float64Array;
  readonly compiled: Compiled;
  readonly plan: Plan;
  readonly workspace: PointWorkspace;
  readonly routines: BlockRoutines;
  /** The heap's two sets of output fields: out1 re, im, out2 re, im. */
  readonly views: readonly (readonly Float64Array[])[];
  readonly exact: Uint8Array;
}

export function createFieldBuffers(n: number): FieldBuffers {
  return {
    out1Re: new Float64Array(n),
    out1Im: new Float64Array(n),
    out2Re: new Float64Array(n),
    out2Im: new Float64Array(n),
  };
}

/**
 * @param routines the inner loops; the fastest that this machine runs when absent
 * @throws RangeError for values outside what a passive circuit has (K outside [0, 1], negative loss or delay, NaN)
 */
export function createKernel(circuit: CircuitParameters, routines: BlockRoutines = blockRoutines()): Kernel {
  const compiled = compile(circuit);
  const plan = createPlan(compiled);
  planInto(plan, compiled);
  return {
    parameters: compiled.parameters,
    compiled,
    plan,
    workspace: createPointWorkspace(),
    routines,
    views: [HEAP.fieldsA, HEAP.fieldsB].map((at) => fieldViews(routines.heap, at)),
    exact: new Uint8Array(BLOCK),
  };
}

function fieldViews(heap: Float64Array, at: number): Float64Array[] {
  return [0, 1, 2, 3].map((k) => heap.subarray(at + k * BLOCK, at + (k + 1) * BLOCK));
}

/** Takes over what was written to `kernel.parameters`. Allocates nothing. Throws as `createKernel`. */
export function refreshKernel(kernel: Kernel): void {
  refresh(kernel.compiled);
  planInto(kernel.plan, kernel.compiled);
}

/** Takes over a circuit of the same structure (cells, rings an arm, join). Throws as `createKernel`. */
export function updateKernel(kernel: Kernel, circuit: CircuitParameters): void {
  if (circuit.join !== kernel.compiled.join) throw new RangeError('the circuit joins its cells differently');
  parametersInto(kernel.parameters, kernel.compiled.layout, circuit);
  refreshKernel(kernel);
}

/**
 * Complex fields of both outputs for light of unit amplitude into in1.
 * @param omegaRad Ω in rad, any order and spacing
 * @param out four buffers at least as long as `omegaRad`
 *
 * Accuracy: 1e-13 a narrow ring, 1e-15 a wide one (see the tests). Cost: about 13 multiplications and additions a ring
 * and frequency, 22 with loss. Allocates nothing.
 */
export function evaluateInto(kernel: Kernel, omegaRad: Float64Array, out: FieldBuffers): void {
  if (kernel.plan.tableCount > HEAP.tables || kernel.plan.ringOrder.length > MOST_RINGS) {
    for (let i = 0; i < omegaRad.length; i++) exactInto(kernel, omegaRad[i]!, out, i);
    return;
  }
  loadConstants(kernel);
  prepareEvenGrid(kernel.plan, kernel.routines, omegaRad);
  for (let start = 0; start < omegaRad.length; start += BLOCK) evaluateBlock(kernel, omegaRad, start, out);
}

function exactInto(kernel: Kernel, omegaRad: number, out: FieldBuffers, i: number): void {
  const { workspace } = kernel;
  evaluatePoint(kernel.compiled, workspace, omegaRad);
  out.out1Re[i] = workspace.out1[0]!;
  out.out1Im[i] = workspace.out1[1]!;
  out.out2Re[i] = workspace.out2[0]!;
  out.out2Im[i] = workspace.out2[1]!;
}

function loadConstants({ plan, compiled, routines }: Kernel): void {
  const { heap } = routines;
  const slots = plan.armFirst[2 * compiled.cells.length]!;
  for (let slot = 0; slot < slots; slot++) {
    const from = plan.ringOrder[slot]! * RING_STRIDE;
    const to = HEAP.rings + slot * HEAP_RING;
    if (plan.slotKind[slot] === LOSSY) {
      for (let k = 0; k < HEAP_RING; k++) heap[to + k] = compiled.ringConstants[from + k]!;
      continue;
    }
    const cosPart = compiled.ringConstants[from + RING_CONSTANT.denominatorCos]!;
    const sinPart = compiled.ringConstants[from + RING_CONSTANT.denominatorSin]!;
    const cosHalf = compiled.ringConstants[from + RING_CONSTANT.cosHalfPhase]!;
    const sinHalf = compiled.ringConstants[from + RING_CONSTANT.sinHalfPhase]!;
    heap[to] = cosPart * cosHalf;
    heap[to + 1] = cosPart * sinHalf;
    heap[to + 2] = sinPart * cosHalf;
    heap[to + 3] = sinPart * sinHalf;
  }
}

function evaluateBlock(kernel: Kernel, omegaRad: Float64Array, start: number, out: FieldBuffers): void {
  const { plan, compiled, routines } = kernel;
  const n = Math.min(BLOCK, omegaRad.length - start);
  const { heap } = routines;
  for (let i = 0; i < n; i++) heap[i] = omegaRad[start + i]!;
  // whole vectors: the inner loops may run up to three frequencies over the end
  const padded = (n + 3) & ~3;
  for (let i = n; i < padded; i++) heap[i] = heap[n - 1]! + (i - n + 1) * (plan.step || 0);
  if (!fillTables(plan, routines, padded)) {
    for (let i = start; i < start + n; i++) exactInto(kernel, omegaRad[i]!, out, i);
    return;
  }
  let from = 0;
  for (let c = 0; c < compiled.cells.length; c++) {
    evaluateCell(
      kernel,
      c,
      padded,
      from === 0 ? HEAP.fieldsA : HEAP.fieldsB,
      from === 0 ? HEAP.fieldsB : HEAP.fieldsA,
    );
    from = 1 - from;
  }
  storeFields(kernel.views[from]!, start, n, out);
  if (plan.narrowCount > 0) redoNearResonance(kernel, omegaRad, start, n, out);
}

function storeFields(views: readonly Float64Array[], start: number, n: number, out: FieldBuffers): void {
  storeField(out.out1Re, views[0]!, start, n);
  storeField(out.out1Im, views[1]!, start, n);
  storeField(out.out2Re, views[2]!, start, n);
  storeField(out.out2Im, views[3]!, start, n);
}

function storeField(out: Float64Array, view: Float64Array, start: number, n: number): void {
  if (n === view.length) out.set(view, start);
  else for (let i = 0; i < n; i++) out[start + i] = view[i]!;
}

function evaluateCell(kernel: Kernel, c: number, n: number, from: number, to: number): void {
  const { compiled, routines } = kernel;
  const { heap } = routines;
  for (let arm = 0; arm < 2; arm++) evaluateArm(kernel, c, arm, n);
  for (let k = 0; k < 4; k++) heap[HEAP.couplers + k] = compiled.cellConstants[c * CELL_STRIDE + k]!;
  if (c === 0) {
    routines.combine(n, HEAP.arms, HEAP.couplers, -1, to);
    return;
  }
  routines.combine(n, HEAP.arms, HEAP.couplers, compiled.join === 'OUT2' ? from + 2 * BLOCK : from, to);
  if (compiled.join === 'BOTH') routines.combineSecond(n, HEAP.arms, HEAP.couplers, from + 2 * BLOCK, to);
}

function evaluateArm({ plan, compiled, routines }: Kernel, c: number, arm: number, n: number): void {
  const constants = c * CELL_STRIDE + (arm === 0 ? CELL_CONSTANT.arm0 : CELL_CONSTANT.arm1);
  const amplitude = compiled.cellConstants[constants + ARM_CONSTANT.amplitude]!;
  const phase = compiled.cellConstants[constants + ARM_CONSTANT.phaseRad]!;
  const valueRe = amplitude * Math.cos(phase);
  const valueIm = -amplitude * Math.sin(phase);
  const re = HEAP.arms + 2 * arm * BLOCK;
  const im = re + BLOCK;
  const index = 2 * c + arm;
  const table = plan.armTable[index]!;
  if (table < 0) routines.fillArm(n, re, im, valueRe, valueIm);
  else {
    const cos = HEAP.table + 2 * table * BLOCK;
    routines.delayArm(n, cos, cos + BLOCK, re, im, valueRe, valueIm);
  }
  // runs of rings of one kind and one delay
  let slot = plan.armFirst[index]!;
  const end = plan.armFirst[index + 1]!;
  while (slot < end) {
    const kind = plan.slotKind[slot]!;
    const delay = plan.slotTable[slot]!;
    let stop = slot + 1;
    const most = Math.min(end, slot + MOST_RUN);
    while (stop < most && plan.slotKind[stop] === kind && plan.slotTable[stop] === delay) stop++;
    const cos = HEAP.table + 2 * delay * BLOCK;
    const rings = HEAP.rings + slot * HEAP_RING;
    if (kind === ALL_PASS) routines.allPassRings(n, cos, cos + BLOCK, rings, stop - slot, re, im);
    else if (kind === LOSSY) routines.lossyRings(n, cos, cos + BLOCK, rings, stop - slot, re, im);
    slot = stop;
  }
}

/** Marks the frequencies within the window of a narrow ring's resonance and computes them again, exactly. */
function redoNearResonance(
  kernel: Kernel,
  omegaRad: Float64Array,
  start: number,
  n: number,
  out: FieldBuffers,
): void {
  const { plan, compiled, exact } = kernel;
  const { heap } = kernel.routines;
  const { windowSin } = plan;
  const block = BLOCK;
  exact.fill(0);
  for (let k = 0; k < plan.narrowCount; k++) {
    const slot = plan.narrow[k]!;
    const at = plan.ringOrder[slot]! * RING_STRIDE;
    const ch = compiled.ringConstants[at + RING_CONSTANT.cosHalfPhase]!;
    const sh = compiled.ringConstants[at + RING_CONSTANT.sinHalfPhase]!;
    const cos = HEAP.table + 2 * plan.slotTable[slot]! * BLOCK;
    for (let i = 0; i < n; i++) {
      const half = heap[cos + block + i]! * ch + heap[cos + i]! * sh;
      if (half < windowSin && half > -windowSin) exact[i] = 1;
    }
  }
  for (let i = 0; i < n; i++) if (exact[i] === 1) exactInto(kernel, omegaRad[start + i]!, out, start + i);
}
