/** Chips for the tests. All names and values are invented; magnitudes are those of silicon nitride and silicon heaters. */
import fc from 'fast-check';
import type {
  ChipModel,
  Coupler,
  DriverChannel,
  HeatedArm,
  InterferometerCell,
} from '../../src/chip/index.ts';
import type { CellJoin } from '../../src/circuit/index.ts';

/** A row of numbers in [0, 1) that is the same every time (Numerical Recipes' quick generator; not for statistics). */
export function invent(seed: number): () => number {
  let state = seed >>> 0;
  return () => {
    state = (Math.imul(state, 1664525) + 1013904223) >>> 0;
    return state / 2 ** 32;
  };
}

/** Evenly spread over an interval, its ends now and then: `fc.double` spreads over bit patterns, most of them near 0. */
export function spread(min: number, max: number): fc.Arbitrary<number> {
  const within = fc
    .noBias(fc.integer({ min: 0, max: 2 ** 31 - 1 }))
    .map((n) => min + ((max - min) * n) / 2 ** 31);
  return fc.oneof({ weight: 9, arbitrary: within }, { weight: 1, arbitrary: fc.constantFrom(min, max) });
}

export function tunable(element: string, change: Partial<Coupler> = {}): Coupler {
  return { element, tunable: true, minCoupling: 0, maxCoupling: 1, heatedArm: 'UPPER', ...change };
}

export function fixed(element: string, powerCrossCoupling: number): Coupler {
  const ends = { minCoupling: powerCrossCoupling, maxCoupling: powerCrossCoupling };
  return { element, tunable: false, powerCrossCoupling, ...ends, heatedArm: 'UPPER' };
}

export interface CellChoice {
  readonly name: string;
  readonly ringsPerArm: readonly [number, number];
  readonly armDelay?: readonly [number, number];
  readonly ringDelay?: number;
  /** In place of the plain tunable ones of the same name. */
  readonly couplers?: readonly Coupler[];
}

function cellOf(choice: CellChoice): InterferometerCell {
  const rings = choice.ringsPerArm[0] + choice.ringsPerArm[1];
  const names = ['input', 'output', ...Array.from({ length: rings }, (_, k) => `ring${k + 1}`)];
  const special = choice.couplers ?? [];
  return {
    name: choice.name,
    ringsPerArm: choice.ringsPerArm,
    armDelay: choice.armDelay ?? [0, 0],
    ringDelay: choice.ringDelay ?? 1,
    couplers: names.map((name) => special.find((coupler) => coupler.element === name) ?? tunable(name)),
  };
}

export interface ChipChoice {
  readonly cells: readonly CellChoice[];
  readonly join?: CellJoin;
  readonly seed: number;
  /** Share of a heater's power at its neighbours; a third of it two places away. */
  readonly crosstalk?: number;
  readonly unitDelayLossDb?: number;
  readonly couplerExcessLossDb?: number;
  readonly resolutionMa?: number;
  readonly heaterFloorRad?: number;
  readonly change?: Partial<ChipModel>;
}

/** Every element that can be heated has its channel, P_2π 40 to 60 mW, 500 Ω, 20 mA. */
export function inventChip(choice: ChipChoice): ChipModel {
  const cells = choice.cells.map(cellOf);
  const random = invent(choice.seed);
  const driven = cells.flatMap((cell) => [
    ...cell.couplers
      .filter((coupler) => coupler.tunable)
      .map(({ element }) => `${cell.name}.${element}.coupling`),
    ...Array.from(
      { length: cell.ringsPerArm[0] + cell.ringsPerArm[1] },
      (_, k) => `${cell.name}.ring${k + 1}.phase`,
    ),
    `${cell.name}.arm.phase`,
  ]);
  const channels: DriverChannel[] = driven.map((drives, index) => ({
    channel: `ch${index + 1}`,
    drives,
    phasePerMw: (2 * Math.PI) / (40 + 20 * random()),
    phaseAtZeroRad: 2 * Math.PI * (random() - 0.5),
    resistanceOhm: 480 + 40 * random(),
    currentLimitMa: 20,
    powerLimitMw: 150,
    resolutionMa: choice.resolutionMa ?? 0.0005,
  }));
  const share = choice.crosstalk ?? 0.02;
  const crosstalk = channels.flatMap((_, i) =>
    channels.map((_, j) => {
      const distance = Math.abs(i - j);
      if (distance === 0) return 1;
      if (distance > 2) return 0;
      return (distance === 1 ? share : share / 3) * (0.5 + 0.5 * random());
    }),
  );
  return {
    referenceFrequencyThz: 193.4,
    fsrGhz: 100,
    cells,
    join: choice.join ?? 'OUT2',
    losses: {
      unitDelayLossDb: choice.unitDelayLossDb ?? 0.1,
      couplerExcessLossDb: choice.couplerExcessLossDb ?? 0.02,
      facetLossDb: 1.5,
    },
    channels,
    crosstalk,
    heaterFloorRad: choice.heaterFloorRad ?? 0.5,
    ...choice.change,
  };
}

/** (a) For interleavers: an arm with a plain unit delay, so that a fifth-order half-band needs four rings. */
export const interleaverChip = inventChip({
  cells: [{ name: 'cell1', ringsPerArm: [2, 2], armDelay: [0, 1] }],
  seed: 11,
  change: { fsrGhz: 100, temperatureC: 25 },
});

/** (b) Two cells of one ring an arm, out2 of the first into in1 of the second. */
export const twoCellChip = inventChip({
  cells: [
    { name: 'front', ringsPerArm: [1, 1] },
    { name: 'back', ringsPerArm: [1, 1] },
  ],
  join: 'OUT2',
  seed: 12,
  unitDelayLossDb: 0.05,
});

/** (c) One cell of three rings an arm, for orders up to 6. */
export const sixRingChip = inventChip({
  cells: [{ name: 'main', ringsPerArm: [3, 3] }],
  seed: 13,
  unitDelayLossDb: 0.2,
  change: { totalPowerLimitMw: 900 },
});

/** (d) Two cells joined by both guides. */
export const bothGuidesChip = inventChip({
  cells: [
    { name: 'first', ringsPerArm: [1, 2] },
    { name: 'second', ringsPerArm: [2, 1] },
  ],
  join: 'BOTH',
  seed: 14,
});

/** The same chip without loss and with a driver so fine that rounding is out of sight. */
export function ideally(chip: ChipModel): ChipModel {
  return {
    ...chip,
    losses: { unitDelayLossDb: 0, couplerExcessLossDb: 0, facetLossDb: 0 },
    channels: chip.channels.map((channel) => ({ ...channel, resolutionMa: 1e-12 })),
  };
}

/** Chips with couplers of any reach and either heated arm, any number of rings up to 3 an arm, any join. */
export const anyChips = fc
  .record({
    seed: fc.integer({ min: 1, max: 1e6 }),
    cells: fc.integer({ min: 1, max: 2 }),
    join: fc.constantFrom<CellJoin>('OUT1', 'OUT2', 'BOTH'),
    crosstalk: fc.constantFrom(0, 0.02, 0.1),
    lossy: fc.boolean(),
    fullReach: fc.boolean(),
  })
  .map(({ seed, cells, join, crosstalk, lossy, fullReach }) => {
    const random = invent(seed);
    const whole = (most: number) => Math.floor(random() * (most + 1));
    return inventChip({
      seed,
      join,
      crosstalk,
      unitDelayLossDb: lossy ? 0.15 : 0,
      couplerExcessLossDb: lossy ? 0.03 : 0,
      cells: Array.from({ length: cells }, (_, c) => {
        const ringsPerArm: [number, number] = [whole(3), whole(3)];
        const names = ['input', 'output'];
        for (let k = 1; k <= ringsPerArm[0] + ringsPerArm[1]; k++) names.push(`ring${k}`);
        return {
          name: `cell${c + 1}`,
          ringsPerArm,
          armDelay: [whole(1), whole(1)] as [number, number],
          couplers: names.map((name) => {
            const heatedArm: HeatedArm = random() < 0.5 ? 'UPPER' : 'LOWER';
            // Joining couplers have to decouple, or no phase between them can be set.
            const joins = join === 'BOTH' && !name.startsWith('ring');
            const reach =
              fullReach || joins ? {} : { minCoupling: 0.05 * random(), maxCoupling: 0.85 + 0.15 * random() };
            return tunable(name, { heatedArm, ...reach });
          }),
        };
      }),
    });
  });
