/**
 * Sine and cosine of δ·Ω/2 for one block of frequencies, one table a delay δ: by sine and cosine of each frequency, or,
 * along an even grid, by turning the table of one block.
 */
import { BLOCK, type BlockRoutines } from './blocks.ts';
import { HEAP, type Plan } from './plan.ts';

/** Beyond this angle δ·Ω the vector sine would lose digits; nobody sweeps 160,000 free spectral ranges. */
const MOST_ANGLE = 1e6;

/** How far a frequency may stray from an even grid, δ·Ω in rad: its square, 1e-18, is lost in rounding. */
const EVEN = 1e-9;

/** On a grid of several blocks that may be even: the half angles of one block, counted from its first frequency. */
export function prepareEvenGrid(plan: Plan, routines: BlockRoutines, omegaRad: Float64Array): void {
  const n = omegaRad.length;
  plan.step = Number.NaN;
  if (n < 2 * BLOCK) return;
  plan.step = (omegaRad[n - 1]! - omegaRad[0]!) / (n - 1);
  if (!(BLOCK * Math.abs(plan.step) * plan.longest <= MOST_ANGLE)) {
    plan.step = Number.NaN;
    return;
  }
  for (let i = 0; i < BLOCK; i++) routines.heap[HEAP.steps + i] = i * plan.step;
  for (let t = 0; t < plan.tableCount; t++) halfAngles(plan, routines, t, BLOCK, HEAP.steps, HEAP.stepTable);
}

function halfAngles(
  plan: Plan,
  routines: BlockRoutines,
  table: number,
  n: number,
  omega: number,
  tables: number,
): void {
  const cos = tables + 2 * table * BLOCK;
  routines.halfAngles(n, omega, plan.tables[table]! / 2, cos, cos + BLOCK);
}

/** Half-angle tables by rotation along an even grid; false, and nothing of use, where the n frequencies are not even. */
function rotateTables(plan: Plan, routines: BlockRoutines, n: number): boolean {
  if (Number.isNaN(plan.step)) return false;
  const first = routines.heap[HEAP.omega]!;
  if (!((Math.abs(first) + BLOCK * Math.abs(plan.step)) * plan.longest <= MOST_ANGLE)) return false;
  for (let t = 0; t < plan.tableCount; t++) {
    const half = plan.tables[t]! / 2;
    const step = HEAP.stepTable + 2 * t * BLOCK;
    const to = HEAP.table + 2 * t * BLOCK;
    const angle = half * first;
    const stray = routines.rotate(
      n,
      HEAP.omega,
      HEAP.steps,
      half,
      step,
      Math.cos(angle),
      Math.sin(angle),
      to,
    );
    if (!(stray * Math.max(1, plan.longest) <= EVEN)) return false;
  }
  return true;
}

/**
 * Half-angle tables of the n frequencies at the front of the heap. False where an angle is too great for the vector sine
 * or not a number.
 */
export function fillTables(plan: Plan, routines: BlockRoutines, n: number): boolean {
  if (rotateTables(plan, routines, n)) return true;
  const { heap } = routines;
  let most = 0;
  for (let i = 0; i < n; i++) most = Math.max(most, Math.abs(heap[i]!));
  if (!(most * plan.longest <= MOST_ANGLE)) return false;
  for (let t = 0; t < plan.tableCount; t++) halfAngles(plan, routines, t, n, HEAP.omega, HEAP.table);
  return true;
}
