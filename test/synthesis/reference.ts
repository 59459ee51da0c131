/** Stored check values as filters and grids. */
import { readFileSync } from 'node:fs';
import { Complex } from 'complex.js';
import type { LabelledFilter } from '../../src/filter/index.ts';

type Pair = readonly [number, number];

export interface ReferenceRing {
  readonly pole: Pair;
  readonly K: number;
  readonly phase_rad?: number;
}

export interface ReferencePair {
  readonly id: string;
  readonly arms: readonly [readonly ReferenceRing[], readonly ReferenceRing[]];
  readonly armPhaseDifferenceRad?: number;
  readonly zeros: readonly Pair[];
  readonly gain: number;
  readonly fsrGhz?: number;
  /** [offset/(FSR/2), re, im] */
  readonly fieldSamples?: readonly (readonly [number, number, number])[];
  /** [offset GHz, dB]; null: an exact null. */
  readonly powerSamples?: readonly (readonly [number, number | null])[];
  /** [offset/(FSR/2), dB] */
  readonly powerSamplesNyquist?: readonly (readonly [number, number | null])[];
  readonly tolerance: Readonly<Record<string, number>>;
}

const complex = ([re, im]: Pair): Complex => new Complex(re, im);

export function referencePairs(): ReferencePair[] {
  const file = new URL('../reference/synthesis-all-pass-pairs.json', import.meta.url);
  return (JSON.parse(readFileSync(file, 'utf8')) as { entries: ReferencePair[] }).entries;
}

export function filterOf(reference: ReferencePair): LabelledFilter {
  const labelled = reference.arms.flatMap((rings, arm) => rings.map((ring) => ({ ring, arm: arm as 0 | 1 })));
  return {
    zeros: reference.zeros.map(complex),
    poles: labelled.map(({ ring }) => complex(ring.pole)),
    gain: new Complex(reference.gain, 0),
    arms: labelled.map(({ arm }) => arm),
  };
}

/** Uniform Ω over one FSR and, around every pole, points in steps of its distance from the circle. */
export function poleAwareGrid(poles: readonly Complex[], uniformPoints = 256): Float64Array {
  const grid = Array.from(
    { length: uniformPoints },
    (_, k) => -Math.PI + (2 * Math.PI * (k + 0.5)) / uniformPoints,
  );
  for (const pole of poles) for (let k = -8; k <= 8; k++) grid.push(pole.arg() + (k / 3) * (1 - pole.abs()));
  return Float64Array.from(grid);
}
