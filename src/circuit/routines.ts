/**
 * Which inner loops run, and what lost. 8 lossless rings on two arms × 4,001 even frequencies, both outputs as complex
 * fields, least of 2,000 runs on one core of an AVX-512 server, Node 20:
 *
 * | loops | µs |
 * |---|---|
 * | WebAssembly SIMD, half angles by rotation along an even grid (these) | 58 |
 * | the same, sine and cosine of every frequency (what an uneven grid costs) | 75 |
 * | the same, copying fields number by number instead of whole views | 94 |
 * | plain typed arrays, same formulas | 125 |
 * | plain typed arrays, Math.sin and Math.cos of every frequency | 166 |
 * | for comparison: C scalar 125, C 128-bit SIMD 73, C AVX-512 37, NumPy ring products 199, NumPy Horner 221 | |
 *
 * Rotating from frequency to frequency was not built: its rounding grows along the grid, while turning a table of one
 * block adds one rounding. Expanding the arms to polynomials was not built: it loses all digits on narrow bands.
 */
import { type BlockRoutines, createPlainBlocks } from './blocks.ts';
import { loadVectorBlocks } from './wasm/load.ts';

let shared: BlockRoutines | undefined;

/** The inner loops that run fastest here, made once a thread. */
export function blockRoutines(): BlockRoutines {
  shared ??= loadVectorBlocks() ?? createPlainBlocks();
  return shared;
}
