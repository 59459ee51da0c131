/** The reference sets of this folder's tests, and the design that an entry of them asks for. */
import { readFileSync } from 'node:fs';
import { Complex } from 'complex.js';
import type { Family, LabelledFilter, PrototypeAsk } from '../../src/filter/index.ts';
import {
  designHighPass,
  designLowPass,
  designMirroredBandPass,
  designMirroredBandStop,
} from '../../src/filter/index.ts';

export type Pair = [number, number];

export function readReference<T>(name: string): T {
  return JSON.parse(readFileSync(new URL(`../reference/filter-${name}.json`, import.meta.url), 'utf8')) as T;
}

export interface DesignEntry {
  readonly id: string;
  readonly family: string;
  readonly order: number;
  readonly band: string;
  readonly edges: readonly number[];
  readonly rippleDb: number | null;
  readonly rejectionDb: number | null;
}

const FAMILIES: Readonly<Record<string, Family>> = {
  butter: 'BUTTERWORTH',
  cheby1: 'CHEBYSHEV_I',
  cheby2: 'CHEBYSHEV_II',
  ellip: 'ELLIPTIC',
  buttord: 'BUTTERWORTH',
  cheb1ord: 'CHEBYSHEV_I',
  cheb2ord: 'CHEBYSHEV_II',
  ellipord: 'ELLIPTIC',
};

export function familyNamed(name: string): Family {
  const family = FAMILIES[name];
  if (family === undefined) throw new Error(`no family is called ${name}`);
  return family;
}

export function askOf(entry: {
  family: Family;
  order: number;
  rippleDb: number | null;
  rejectionDb: number | null;
}): PrototypeAsk {
  return {
    family: entry.family,
    order: entry.order,
    ...(entry.rippleDb === null ? {} : { rippleDb: entry.rippleDb }),
    ...(entry.rejectionDb === null ? {} : { rejectionDb: entry.rejectionDb }),
  };
}

export function designOf(entry: DesignEntry): LabelledFilter {
  const ask = askOf({ ...entry, family: familyNamed(entry.family) });
  const low = entry.edges[0]! * Math.PI;
  const high = (entry.edges[1] ?? 0) * Math.PI;
  switch (entry.band) {
    case 'lowpass':
      return designLowPass({ ...ask, edgeRad: low });
    case 'highpass':
      return designHighPass({ ...ask, edgeRad: low });
    case 'bandpass':
      return designMirroredBandPass({ ...ask, lowEdgeRad: low, highEdgeRad: high });
    default:
      return designMirroredBandStop({ ...ask, lowEdgeRad: low, highEdgeRad: high });
  }
}

/** Greatest distance from an expected root to the nearest actual one, each actual one used once. */
export function rootDistance(actual: readonly Complex[], expected: readonly Pair[]): number {
  if (actual.length !== expected.length) return Number.POSITIVE_INFINITY;
  const free = [...actual];
  let worst = 0;
  for (const [re, im] of expected) {
    const distances = free.map((root) => root.sub(new Complex(re, im)).abs());
    const least = Math.min(...distances);
    free.splice(distances.indexOf(least), 1);
    worst = Math.max(worst, least);
  }
  return worst;
}
