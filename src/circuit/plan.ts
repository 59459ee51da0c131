/** Which tables, runs of rings and exact windows an evaluation needs: follows from the compiled constants. */
import { BLOCK, HEAP_SIZE } from './blocks.ts';
import { ARM_CONSTANT, CELL_CONSTANT, CELL_STRIDE, type Compiled, UNCOUPLED } from './compiled.ts';
import { RING_CONSTANT, RING_STRIDE } from './elements.ts';

/**
 * A ring whose denominator falls below this on resonance is narrow: beside it the addition theorem's rounding of about
 * 2e-16 would cost 2·2e-16/0.01 = 4e-14 of the ring and more, so the frequencies within the window of as many rad are
 * computed by the exact form instead.
 */
const NARROW = 0.01;

/** Most different delays for which half-angle tables fit the heap; circuits with more go frequency by frequency. */
const MOST_TABLES = 16;

/** Positions in the heap. */
export const HEAP = {
  omega: 0,
  arms: BLOCK,
  fieldsA: 5 * BLOCK,
  fieldsB: 9 * BLOCK,
  table: 13 * BLOCK,
  tables: MOST_TABLES,
  /** The same tables for the angles of one block of an even grid, from 0. */
  stepTable: (13 + 2 * MOST_TABLES) * BLOCK,
  /** Those angles as Ω. */
  steps: (13 + 4 * MOST_TABLES) * BLOCK,
  couplers: (14 + 4 * MOST_TABLES) * BLOCK,
  rings: (14 + 4 * MOST_TABLES) * BLOCK + 8,
} as const;

/** Most rings whose constants fit the heap. */
export const MOST_RINGS = Math.floor((HEAP_SIZE - HEAP.rings) / 6);

export interface Plan {
  /** Different delays in unit delays, `tableCount` of them. */
  readonly tables: Float64Array;
  tableCount: number;
  /** The longest of them. */
  longest: number;
  /** Ring of every slot, `slots` of them: uncoupled rings have none, the rest stand arm by arm, equal kinds together. */
  readonly ringOrder: Int32Array;
  readonly slotKind: Uint8Array;
  readonly slotTable: Int32Array;
  /** First slot of every arm, and one past the last. */
  readonly armFirst: Int32Array;
  /** Table of the arm's own delay, −1 where it has none. */
  readonly armTable: Int32Array;
  /** Slots of narrow rings. */
  readonly narrow: Int32Array;
  narrowCount: number;
  readonly windowSin: number;
  /** Step of the even grid that is being evaluated; not a number where there is none. */
  step: number;
}

export function createPlan(compiled: Compiled): Plan {
  const rings = compiled.ringKind.length;
  const arms = 2 * compiled.cells.length;
  return {
    tables: new Float64Array(rings + arms),
    tableCount: 0,
    longest: 0,
    ringOrder: new Int32Array(rings),
    slotKind: new Uint8Array(rings),
    slotTable: new Int32Array(rings),
    armFirst: new Int32Array(arms + 1),
    armTable: new Int32Array(arms),
    narrow: new Int32Array(rings),
    narrowCount: 0,
    windowSin: Math.sin(NARROW / 2),
    step: Number.NaN,
  };
}

function tableOf(plan: Plan, delay: number): number {
  for (let t = 0; t < plan.tableCount; t++) if (plan.tables[t] === delay) return t;
  plan.tables[plan.tableCount] = delay;
  plan.longest = Math.max(plan.longest, delay);
  return plan.tableCount++;
}

function placeRing(plan: Plan, compiled: Compiled, ring: number, slot: number): void {
  const at = ring * RING_STRIDE;
  plan.ringOrder[slot] = ring;
  plan.slotKind[slot] = compiled.ringKind[ring]!;
  plan.slotTable[slot] = tableOf(plan, compiled.ringConstants[at + RING_CONSTANT.delay]!);
  if (compiled.ringConstants[at + RING_CONSTANT.denominatorCos]! < NARROW)
    plan.narrow[plan.narrowCount++] = slot;
}

/** Makes the plan anew, in place. */
export function planInto(plan: Plan, compiled: Compiled): void {
  plan.tableCount = 0;
  plan.longest = 0;
  plan.narrowCount = 0;
  let slot = 0;
  for (let c = 0; c < compiled.cells.length; c++) {
    const { firstRing, ringsPerArm } = compiled.cells[c]!;
    for (let arm = 0; arm < 2; arm++) {
      const constants = c * CELL_STRIDE + (arm === 0 ? CELL_CONSTANT.arm0 : CELL_CONSTANT.arm1);
      const delay = compiled.cellConstants[constants + ARM_CONSTANT.delay]!;
      plan.armTable[2 * c + arm] = delay === 0 ? -1 : tableOf(plan, delay);
      plan.armFirst[2 * c + arm] = slot;
      const first = firstRing + (arm === 0 ? 0 : ringsPerArm[0]);
      for (let ring = first; ring < first + ringsPerArm[arm]!; ring++) {
        if (compiled.ringKind[ring] !== UNCOUPLED) placeRing(plan, compiled, ring, slot++);
      }
    }
  }
  plan.armFirst[2 * compiled.cells.length] = slot;
}
