import { type BlockRoutines, createPlainBlocks } from './blocks.ts';
import { loadVectorBlocks } from './wasm/load.ts';

let shared: BlockRoutines | undefined;

/** The inner loops that run fastest here, made once a thread. */
export function blockRoutines(): BlockRoutines {
  shared ??= loadVectorBlocks() ?? createPlainBlocks();
  return shared;
}
