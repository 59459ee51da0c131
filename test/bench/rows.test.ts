/** That the benchmark's rows are rows; how fast anything is, no test says. */
import { execFileSync } from 'node:child_process';
import { describe, expect, it } from 'vitest';
import { benchDesign } from './design.ts';
import { benchKernel } from './kernel.ts';
import type { Topic } from './row.ts';
import { median, quantile } from './statistics.ts';
import { tableOf } from './table.ts';

/** A ratio of two figures of the same run. */
const SAME_DIGITS = 1e-12;

function isThere(program: string, ...args: string[]): boolean {
  try {
    execFileSync(program, args, { stdio: 'ignore' });
    return true;
  } catch {
    return false;
  }
}

function expectWellFormed({ title, rows, missing }: Topic): void {
  expect(title).not.toBe('');
  for (const { name, ours, peer, peerName, unit, ratio } of rows) {
    for (const text of [name, peerName]) expect(text).not.toBe('');
    expect(unit).toBe('µs');
    for (const figure of [ours, peer]) expect(Number.isFinite(figure) && figure > 0).toBe(true);
    expect(Math.abs((ratio * ours) / peer - 1)).toBeLessThan(SAME_DIGITS);
  }
  expect(new Set(rows.map(({ name, peerName, note }) => `${name} ${peerName} ${note}`)).size).toBe(
    rows.length,
  );
  for (const peer of missing) expect(rows.some(({ peerName }) => peerName.startsWith(peer))).toBe(false);
}

describe('rows of the benchmark', () => {
  it('compare the kernel with what this machine has, and name what it has not [regression]', async () => {
    const topic = await benchKernel({ quick: true });
    expectWellFormed(topic);
    const peers = topic.rows.map(({ peerName }) => peerName);
    expect(peers.filter((name) => name === 'the plain typed-array loop')).toHaveLength(2);
    const [hasC, hasNumPy] = [isThere('gcc', '--version'), isThere('python3', '-c', 'import numpy')];
    expect(peers.some((name) => name.startsWith('C, '))).toBe(hasC);
    expect(peers.some((name) => name.startsWith('NumPy, '))).toBe(hasNumPy);
    expect(topic.missing.includes('gcc')).toBe(!hasC);
    expect(topic.missing.includes('python3 with NumPy')).toBe(!hasNumPy);
  });

  it('compare designs with SciPy where it is, and are left out where it is not [regression]', async () => {
    const topic = await benchDesign({ quick: true });
    expectWellFormed(topic);
    const hasSciPy = isThere('python3', '-c', 'import scipy.signal');
    expect(topic.rows).toHaveLength(hasSciPy ? 3 : 0);
    expect(topic.missing).toEqual(hasSciPy ? [] : ['python3 with SciPy']);
  });

  it('stand in columns, and what is missing is said below them [property]', () => {
    const row = {
      name: 'one',
      ours: 12.34,
      peer: 5678,
      peerName: 'peer',
      unit: 'µs',
      ratio: 460.13,
      note: 'n',
    };
    const text = tableOf({
      title: 'Topic',
      rows: [row, { ...row, name: 'another', note: '' }],
      missing: ['gcc'],
    });
    const lines = text.split('\n');
    expect(lines).toHaveLength(5);
    expect(lines[0]).toBe('Topic');
    const units = lines.slice(2, 4).map((line) => line.indexOf('µs'));
    expect(units[0]).toBeGreaterThan(0);
    expect(new Set(units).size).toBe(1);
    expect(lines[2]).toMatch(/^ {2}one +12\.3 +5,678 +µs +460\.13 +peer +n$/);
    expect(lines[4]).toBe('  not on this machine: gcc');
  });

  it('quantiles are values that were measured, by nearest rank [property]', () => {
    const measured = [5, 1, 4, 2, 3];
    expect([0, 0.2, 0.21, 0.5, 0.95, 1].map((share) => quantile(measured, share))).toEqual([
      1, 1, 2, 3, 5, 5,
    ]);
    expect(median(measured)).toBe(3);
    expect(measured).toEqual([5, 1, 4, 2, 3]);
    expect(() => quantile([], 0.5)).toThrow(RangeError);
  });
});
