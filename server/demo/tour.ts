/**
 * The job once through, over HTTP as any script would do it: register the invented chips, ask for two designs, watch
 * them, print them, release one and pull it as the instrument PC does.
 */
import { readFile, writeFile } from 'node:fs/promises';
import { join } from 'node:path';
import type { Client } from './client.ts';
import { complianceTable, currentTable, type DesignAnswer, sectionTable } from './tables.ts';

const LAB = new URL('../../examples/lab/', import.meta.url);

/** A design takes milliseconds to seconds; a minute without an end is a defect worth stopping for. */
const LONGEST_WAIT_MS = 60_000;
const LOOK_EVERY_MS = 40;
const BAR = 24;

type Say = (text: string) => void;

interface ChipFile {
  readonly serial: string;
  readonly description: string;
  readonly model: unknown;
}

async function labFile<T>(name: string): Promise<T> {
  return JSON.parse(await readFile(new URL(name, LAB), 'utf8')) as T;
}

async function registerChip(client: Client, name: string, say: Say): Promise<void> {
  const { serial, description, model } = await labFile<ChipFile>(name);
  await client.ask(`/v1/chips/${serial}`, {
    method: 'PUT',
    headers: { 'if-none-match': '*' },
    body: { description, model },
  });
  say(`  chip ${serial}: ${description}`);
}

interface RequestAnswer {
  readonly id: string;
  readonly state: 'QUEUED' | 'RUNNING' | 'DONE' | 'FAILED' | 'CANCELLED';
  readonly progress: number;
  readonly problem: { readonly detail: string } | null;
}

/** Posts the request and follows it; every change of state or progress is one line. */
async function design(client: Client, name: string, say: Say): Promise<DesignAnswer> {
  const asked = await client.ask('/v1/design-requests', { method: 'POST', body: await labFile(name) });
  const path = asked.headers.get('location') ?? asked.headers.get('content-location');
  if (path === null) throw new Error('the service did not say where the request is');
  const from = performance.now();
  let last = '';
  for (;;) {
    const request = (await client.ask(path)).body as RequestAnswer;
    const filled = Math.round(request.progress * BAR);
    const line = `  ${request.state.padEnd(7)} [${'#'.repeat(filled)}${'.'.repeat(BAR - filled)}] ${Math.round(100 * request.progress)} %`;
    if (line !== last) say(line);
    last = line;
    if (request.state === 'DONE') break;
    if (request.state === 'FAILED' || request.state === 'CANCELLED')
      throw new Error(request.problem?.detail ?? request.state);
    if (performance.now() - from > LONGEST_WAIT_MS)
      throw new Error(`no end after ${LONGEST_WAIT_MS / 1000} s`);
    await new Promise((resolve) => setTimeout(resolve, LOOK_EVERY_MS));
  }
  const repeated = await client.ask('/v1/design-requests', { method: 'POST', body: await labFile(name) });
  return repeated.body as DesignAnswer;
}

async function printDesign(
  client: Client,
  name: string,
  answer: DesignAnswer,
  plots: string,
  say: Say,
): Promise<void> {
  say(`\n  ${answer.reason}\n\n${sectionTable(answer)}`);
  for (const { element, how } of answer.setting.parked) say(`  parked: ${element}, ${how}`);
  say(
    `\n${complianceTable(answer)}\n\n${currentTable(answer)}\n  total ${answer.setting.totalPowerMw.toFixed(1)} mW`,
  );
  say('\n  plots (SVG), from /v1/designs/{id}/plots/{name}.svg');
  for (const plot of ['transmission', 'group-delay', 'pole-zero']) {
    const svg = await client.ask(`/v1/designs/${answer.id}/plots/${plot}.svg`);
    const file = join(plots, `${name}-${plot}.svg`);
    await writeFile(file, String(svg.body));
    say(`    ${file}`);
  }
  for (const { code, text } of answer.setting.cautions) say(`\n  CAUTION ${code}: ${text}`);
}

async function releaseAndPull(client: Client, chip: string, answer: DesignAnswer, say: Say): Promise<void> {
  const saved = await client.ask(`/v1/chips/${chip}/configurations/pump-trap/versions`, {
    method: 'POST',
    body: { design: answer.id, note: 'Invented example' },
  });
  say(`  version saved: ${saved.headers.get('location')}`);
  const current = `/v1/chips/${chip}/releases/current`;
  await client.ask(current, { method: 'PUT', body: { configuration: 'pump-trap', version: 1 } });
  const first = await client.ask(`${current}.csv`);
  const tag = first.headers.get('etag') ?? '';
  const lines = String(first.body).trim().split('\r\n');
  say(`  pull:  ${first.status}  ETag ${tag}, ${lines.length - 1} channels`);
  say(
    lines
      .slice(0, 3)
      .map((line) => `    ${line}`)
      .join('\n'),
  );
  const again = await client.ask(`${current}.csv`, { headers: { 'if-none-match': tag } });
  say(`  again: ${again.status}  nothing new`);
}

/** `plots`: the folder that gets the SVG files. */
export async function runTour(client: Client, plots: string, say: Say): Promise<void> {
  say('\nThe lab, its chips and all numbers here are invented.\n\nChips');
  await registerChip(client, 'chip-interleaver.json', say);
  await registerChip(client, 'chip-pump-rejection.json', say);
  say('\nInterleaver: channels 50 GHz apart, split onto two outputs');
  await printDesign(client, 'interleaver', await design(client, 'request-interleaver.json', say), plots, say);
  say('\nPump rejection: 60 dB at 193.4 THz, signal and idler passed within 1 dB');
  const pump = await design(client, 'request-pump-rejection.json', say);
  await printDesign(client, 'pump-rejection', pump, plots, say);
  say('\nRelease');
  await releaseAndPull(client, 'HL-PR6-02', pump, say);
}
