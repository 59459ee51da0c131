/** What passes between a worker process and its threads: plain data, so that structured cloning keeps it whole. */
import type { MessagePort } from 'node:worker_threads';
import type { ChipModelInput } from '../../schema/chip.ts';
import type { Design } from '../../src/design/index.ts';
import type { RefusalDetails } from '../../src/errors.ts';

export interface ThreadTask {
  /** Canonical text of the question: `{specification, synthesis, …}`. */
  readonly canonical: string;
  /** The chip's model as it was given. */
  readonly model: ChipModelInput;
  /** Progress goes out here as bare numbers in [0, 1]. */
  readonly port: MessagePort;
}

/** An `Error` loses its class on the way out of a thread; what the core throws on purpose therefore leaves as a value. */
export type ThreadAnswer =
  | { readonly outcome: 'DESIGN'; readonly design: Design; readonly resultHash: string }
  | { readonly outcome: 'REFUSED'; readonly details: RefusalDetails }
  /** `detail`: which iteration, after how many steps, how far off. */
  | { readonly outcome: 'NOT_CONVERGED'; readonly detail: string };
