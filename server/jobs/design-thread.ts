/** Runs inside a worker thread: the question and the chip in, the design or why there is none out. */
import { createHash } from 'node:crypto';
import { chipModelOf } from '../../schema/chip.ts';
import { canonicalJson } from '../../schema/jcs.ts';
import { computeDesign, type DesignQuestion } from '../../src/design/index.ts';
import { NoConvergence, Refusal } from '../../src/errors.ts';
import type { ThreadAnswer, ThreadTask } from './answer.ts';

/** Loading this file is all that warming takes: the thread has then compiled the core. */
export function warm(): void {}

/** Tells whether two machines computed the same digits. */
function resultHashOf(design: unknown): string {
  return createHash('sha256').update(canonicalJson(design), 'utf8').digest('hex');
}

export function design({ canonical, model, port }: ThreadTask): ThreadAnswer {
  const { specification, synthesis } = JSON.parse(canonical) as DesignQuestion;
  try {
    const result = computeDesign({ specification, synthesis }, chipModelOf(model), {
      onProgress: (fraction) => port.postMessage(fraction),
    });
    return { outcome: 'DESIGN', design: result, resultHash: resultHashOf(result) };
  } catch (error) {
    if (error instanceof Refusal) return { outcome: 'REFUSED', details: error.details };
    if (error instanceof NoConvergence) return { outcome: 'NOT_CONVERGED', detail: error.message };
    throw error;
  }
}
