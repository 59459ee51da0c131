/** Random circuits for property tests. All values invented. */
import fc from 'fast-check';
import type {
  ArmParameters,
  CellJoin,
  CircuitParameters,
  InterferometerParameters,
  RingParameters,
} from '../../src/circuit/index.ts';

export interface CircuitChoices {
  /** Least K of a ring. */
  readonly leastCoupling: number;
  readonly lossy: boolean;
  readonly delays: 'UNIT' | 'INTEGER' | 'ANY';
  readonly mostRings?: number;
  readonly joins?: readonly CellJoin[];
}

/** Evenly spread over the interval: `fc.double` itself spreads over bit patterns, most of them next to nothing. */
const finite = (min: number, max: number) =>
  fc.noBias(fc.integer({ min: 0, max: 2 ** 31 - 1 })).map((n) => min + ((max - min) * n) / (2 ** 31 - 1));

/** K spread evenly in its logarithm, with both ends and 1 of their own. */
function couplings(least: number): fc.Arbitrary<number> {
  const spread = finite(Math.log(least), 0).map((x) => Math.min(1, Math.max(least, Math.exp(x))));
  return fc.oneof({ weight: 8, arbitrary: spread }, { weight: 1, arbitrary: fc.constantFrom(least, 0.5, 1) });
}

function delays(kind: CircuitChoices['delays']): fc.Arbitrary<number> {
  if (kind === 'UNIT') return fc.constant(1);
  if (kind === 'INTEGER') return fc.integer({ min: 1, max: 3 });
  return fc.oneof(fc.constant(1), finite(0.05, 3));
}

export function randomCircuits(choices: CircuitChoices): fc.Arbitrary<CircuitParameters> {
  const losses = choices.lossy ? fc.oneof(fc.constant(0), finite(0, 3)) : fc.constant(0);
  const phases = finite(-Math.PI, Math.PI);
  const ring: fc.Arbitrary<RingParameters> = fc.record({
    powerCrossCoupling: couplings(choices.leastCoupling),
    phaseRad: phases,
    lossDb: losses,
    delay: delays(choices.delays),
  });
  const arm: fc.Arbitrary<ArmParameters> = fc.record({
    rings: fc.array(ring, { maxLength: choices.mostRings ?? 8 }),
    delay: choices.delays === 'ANY' ? fc.oneof(fc.constant(0), finite(0, 4)) : fc.integer({ min: 0, max: 3 }),
    phaseRad: phases,
    lossDb: losses,
  });
  const cell: fc.Arbitrary<InterferometerParameters> = fc.record({
    inputCoupling: finite(0, 1),
    outputCoupling: finite(0, 1),
    arms: fc.tuple(arm, arm),
    couplerExcessLossDb: losses,
  });
  return fc.record({
    cells: fc.array(cell, { minLength: 1, maxLength: 4 }),
    join: fc.constantFrom<CellJoin>(...(choices.joins ?? (['OUT1', 'OUT2', 'BOTH'] as const))),
  });
}

/** Ω over a few turns of the circle, none singled out: special values are the business of tests that name them. */
export function randomOmegas(most = 7): fc.Arbitrary<Float64Array> {
  const omega = finite(-3 * Math.PI, 3 * Math.PI);
  return fc.array(omega, { minLength: 1, maxLength: most }).map((list) => Float64Array.from(list));
}
