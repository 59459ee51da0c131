/** Rows as aligned plain text. */
import type { BenchRow, Topic } from './row.ts';

const HEADER = ['', 'ours', 'peer', '', 'ratio', 'against', 'note'];
/** Columns that are numbers stand right. */
const RIGHT = new Set([1, 2, 4]);

function figure(value: number): string {
  if (value >= 1000) return value.toFixed(0).replace(/\B(?=(\d{3})+$)/g, ',');
  return value.toFixed(value >= 100 ? 0 : value >= 10 ? 1 : 2);
}

const cells = ({ name, ours, peer, peerName, unit, ratio, note }: BenchRow): string[] => [
  name,
  figure(ours),
  figure(peer),
  unit,
  ratio.toFixed(2),
  peerName,
  note,
];

export function tableOf({ title, rows, missing }: Topic): string {
  const lines = [HEADER, ...rows.map(cells)];
  const widths = HEADER.map((_, column) => Math.max(...lines.map((line) => line[column]!.length)));
  const aligned = lines.map((line) =>
    line
      .map((cell, column) =>
        RIGHT.has(column) ? cell.padStart(widths[column]!) : cell.padEnd(widths[column]!),
      )
      .join('  ')
      .trimEnd(),
  );
  const absent = missing.map((peer) => `not on this machine: ${peer}`);
  return [title, ...(rows.length > 0 ? aligned : []), ...absent]
    .map((line, i) => (i === 0 ? line : `  ${line}`))
    .join('\n');
}
