import { type BlockRoutines, createPlainBlocks } from './blocks.ts';

let shared: BlockRoutines | undefined;

/** The inner loops that run fastest here, made once a thread. */
export function blockRoutines(): BlockRoutines {
  shared ??= createPlainBlocks();
  return shared;
}
