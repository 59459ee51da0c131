// Builds the kernel's inner loops from AssemblyScript and writes the binary as text, so that src does no input or output.
// The result is a function of the source and the pinned compiler; a test builds again and compares.
import { mkdtemp, readFile, rm, writeFile } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import asc from 'assemblyscript/asc';

const root = fileURLToPath(new URL('..', import.meta.url));
const source = 'src/circuit/wasm/assembly/blocks.ts';
const target = join(root, 'src/circuit/wasm/binary.generated.ts');

/** Lines of base64 in the generated file. */
const WIDTH = 96;

export async function buildKernel(): Promise<Buffer> {
  const folder = await mkdtemp(join(tmpdir(), 'kernel-'));
  try {
    const file = join(folder, 'kernel.wasm');
    const flags = ['-O3', '--runtime', 'stub', '--noAssert', '--enable', 'simd'];
    const memory = ['--initialMemory', '4', '--maximumMemory', '4'];
    const { error, stderr } = await asc.main(
      [source, '-o', file, '--baseDir', root, ...flags, ...memory],
      {},
    );
    if (error) throw new Error(`the kernel does not compile: ${stderr.toString()}`, { cause: error });
    return await readFile(file);
  } finally {
    await rm(folder, { recursive: true, force: true });
  }
}

/** The generated file's text. */
export function asModule(binary: Buffer): string {
  const lines = binary.toString('base64').match(new RegExp(`.{1,${WIDTH}}`, 'g')) ?? [];
  const text = lines.map((line) => `  '${line}',`).join('\n');
  return `/** Made by \`npm run build:kernel\` from assembly/blocks.ts. */\nexport const KERNEL_BASE64 = [\n${text}\n].join('');\n`;
}

if (process.argv[1] === fileURLToPath(import.meta.url))
  await writeFile(target, asModule(await buildKernel()));
