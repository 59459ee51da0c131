/** The inner loops as WebAssembly SIMD, where the machine has it. What was measured: src/circuit/routines.ts. */
import type { BlockRoutines } from '../blocks.ts';
import { KERNEL_BASE64 } from './binary.generated.ts';

/** The part of the WebAssembly interface that is used; its types come with the browser library, which is not loaded. */
interface WebAssemblyHost {
  validate(bytes: Uint8Array): boolean;
  Module: new (bytes: Uint8Array) => object;
  Instance: new (module: object) => { readonly exports: Readonly<Record<string, unknown>> };
}

type Loops = Omit<BlockRoutines, 'heap'>;

/** The routines on a memory of their own, or null where this machine does not run them. */
export function loadVectorBlocks(): BlockRoutines | null {
  const host = (globalThis as { WebAssembly?: WebAssemblyHost }).WebAssembly;
  if (host === undefined) return null;
  const bytes = Uint8Array.from(atob(KERNEL_BASE64), (character) => character.charCodeAt(0));
  if (!host.validate(bytes)) return null;
  const { exports } = new host.Instance(new host.Module(bytes));
  const { memory, ...loops } = exports as unknown as Loops & { memory: { buffer: ArrayBuffer } };
  return { ...loops, heap: new Float64Array(memory.buffer) };
}
