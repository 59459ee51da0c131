/**
 * Ours against others, all measured in this run on this machine. `--quick` proves that everything runs; `--only=` takes
 * a comma-separated list of kernel, design, http, queue.
 */
import { availableParallelism, cpus, loadavg } from 'node:os';
import { benchDesign } from './design.ts';
import { benchHttp } from './http.ts';
import { benchKernel } from './kernel.ts';
import { benchQueue } from './queue.ts';
import type { Effort, Topic } from './row.ts';
import { startServices } from './services.ts';
import { tableOf } from './table.ts';

const TOPICS = ['kernel', 'design', 'http', 'queue'] as const;
type Name = (typeof TOPICS)[number];

function topicsAsked(options: readonly string[]): readonly Name[] {
  const only = options.find((option) => option.startsWith('--only='))?.slice('--only='.length);
  if (only === undefined) return TOPICS;
  const names = only.split(',');
  const unknown = names.find((name) => !TOPICS.some((topic) => topic === name));
  if (unknown !== undefined) throw new Error(`--only takes ${TOPICS.join(', ')}, not ${unknown}`);
  return TOPICS.filter((topic) => names.includes(topic));
}

function machine(): string {
  const model = cpus()[0]?.model.trim() ?? 'unknown processor';
  const load = loadavg()[0]!.toFixed(1);
  return `${model}, ${availableParallelism()} cores, Node.js ${process.version}, ${process.platform}, load ${load} at the start`;
}

const tell = (topic: Topic): void => console.log(`\n${tableOf(topic)}`);

const options = process.argv.slice(2);
const asked = topicsAsked(options);
const effort: Effort = { quick: options.includes('--quick') };

console.log(machine());
console.log('Ratio above 1: ours is the faster. Medians where nothing else is said.');
if (effort.quick) console.log('Quick: the figures are coarse.');
if (asked.includes('kernel')) tell(await benchKernel(effort));
if (asked.includes('design')) tell(await benchDesign(effort));
if (asked.includes('http') || asked.includes('queue')) {
  const services = await startServices();
  try {
    if (asked.includes('http')) tell(await benchHttp(services, effort));
    if (asked.includes('queue')) tell(await benchQueue(services, effort));
  } finally {
    await services.stop();
  }
}
