/** An ideal circuit and its place on a chip respond alike, by the general solver. */
import { describe, expect, it } from 'vitest';
import {
  type ChipModel,
  type FitOptions,
  fitToChip,
  type IdealCircuit,
  ringCapacity,
} from '../../src/chip/index.ts';
import type { InterferometerParameters, RingParameters } from '../../src/circuit/index.ts';
import { Refusal, type RefusalDetails } from '../../src/errors.ts';
import { synthesiseAllPassPair } from '../../src/synthesis/index.ts';
import { difference, fieldsOf } from './fields.ts';
import {
  bothGuidesChip,
  type CellChoice,
  fixed,
  interleaverChip,
  inventChip,
  sixRingChip,
  tunable,
  twoCellChip,
} from './invented-chips.ts';
import { labelledFilter } from './reference-filters.ts';

/** Both sides go through the general solver: a dozen elements, rings no narrower than K = 0.05. */
const ALIKE = 1e-12;

const ring = (powerCrossCoupling: number, phaseRad: number): RingParameters => ({
  powerCrossCoupling,
  phaseRad,
  lossDb: 0,
  delay: 1,
});

function interferometer(
  upper: readonly RingParameters[],
  lower: readonly RingParameters[],
  change: { input?: number; output?: number; phaseRad?: number; delay?: readonly [number, number] } = {},
): InterferometerParameters {
  const [d0, d1] = change.delay ?? [0, 0];
  return {
    inputCoupling: change.input ?? 0.5,
    outputCoupling: change.output ?? 0.5,
    arms: [
      { rings: upper, delay: d0, phaseRad: 0, lossDb: 0 },
      { rings: lower, delay: d1, phaseRad: change.phaseRad ?? 0.9, lossDb: 0 },
    ],
    couplerExcessLossDb: 0,
  };
}

const pair = (cell: InterferometerParameters): IdealCircuit => ({ architecture: 'ALL_PASS_PAIR', cell });
const OUT1: FitOptions = { output: 'OUT1', parkAtRad: 2.1 };
const oneCell = (choice: Partial<CellChoice>): ChipModel =>
  inventChip({ cells: [{ name: 'cell1', ringsPerArm: [2, 2], ...choice }], seed: 5 });

/** Both outputs of the placed circuit against the ideal cell's. */
function expectAlike(cell: InterferometerParameters, chip: ChipModel, options: FitOptions, delay = 0): void {
  const placed = fitToChip(pair(cell), chip, options);
  const here = fieldsOf(placed.circuit);
  const ideal = fieldsOf({ cells: [cell], join: 'OUT1' });
  const moved = (options.carriedOn ?? options.output) !== options.output;
  expect(difference(here.out1, moved ? ideal.out2 : ideal.out1, delay)).toBeLessThan(ALIKE);
  expect(difference(here.out2, moved ? ideal.out1 : ideal.out2, delay)).toBeLessThan(ALIKE);
}

function refusal(work: () => unknown): RefusalDetails {
  try {
    work();
  } catch (reason) {
    if (reason instanceof Refusal) return reason.details;
    throw reason;
  }
  throw new Error('nothing was refused');
}

const unequal = interferometer([ring(0.6, 0.4), ring(0.3, -1)], [ring(0.8, 2)], {
  input: 0.37,
  output: 0.58,
});

describe('all-pass pair on one cell', () => {
  it('responds as the ideal on both outputs, with spare rings decoupled [cross-check]', () => {
    expectAlike(unequal, sixRingChip, OUT1);
    const { parked } = fitToChip(pair(unequal), sixRingChip, OUT1);
    expect(parked.map(({ element }) => element)).toHaveLength(3);
    expect(parked.every(({ how }) => how.startsWith('decoupled'))).toBe(true);
  });

  it('moves the filter to the other output on demand, with unequal end couplers too [cross-check]', () => {
    expectAlike(unequal, sixRingChip, { ...OUT1, output: 'OUT2', carriedOn: 'OUT1' });
    expectAlike(unequal, sixRingChip, { ...OUT1, output: 'OUT1', carriedOn: 'OUT2' });
  });

  it('exchanges the arms where only that fits [cross-check]', () => {
    expectAlike(unequal, oneCell({ ringsPerArm: [1, 2] }), OUT1);
    expectAlike(unequal, oneCell({ ringsPerArm: [1, 2] }), { ...OUT1, output: 'OUT2', carriedOn: 'OUT1' });
  });

  it('makes a ring with K = 1 the plain delay of an arm that has one [cross-check]', () => {
    const withDelay = interferometer([ring(2 / 3, Math.PI / 2), ring(2 / 3, -Math.PI / 2)], [ring(1, 0.3)]);
    expectAlike(withDelay, interleaverChip, OUT1);
    const { cells } = fitToChip(pair(withDelay), interleaverChip, OUT1);
    expect(cells[0]!.rings.filter((one) => one.powerCrossCoupling === 1)).toHaveLength(0);
    expectAlike({ ...withDelay, arms: [withDelay.arms[1], withDelay.arms[0]] }, interleaverChip, OUT1);
  });

  it('keeps a ring with K = 1 where the chip has no delay and the coupler reaches 1 [cross-check]', () => {
    const withDelay = interferometer([ring(0.7, 1), ring(0.4, -1)], [ring(1, 0.3)]);
    expectAlike(withDelay, oneCell({}), OUT1);
    const short = [3, 4].map((k) => tunable(`ring${k}`, { maxCoupling: 0.98 }));
    const others = [1, 2].map((k) => tunable(`ring${k}`, { maxCoupling: 0.98 }));
    const refused = refusal(() =>
      fitToChip(pair(withDelay), oneCell({ couplers: [...short, ...others] }), OUT1),
    );
    expect(refused).toMatchObject({ limit: 'COUPLING_RANGE', given: 1, allowed: { min: 0, max: 0.98 } });
  });

  it('makes good an unwanted delay by rings with K = 1 on the other arm, up to a whole delay [cross-check]', () => {
    expectAlike(interferometer([ring(0.7, 1)], [ring(0.4, -1)]), interleaverChip, OUT1, 1);
    const full = interferometer([ring(0.7, 1), ring(0.2, 2)], [ring(0.4, -1), ring(0.6, 0)]);
    expect(refusal(() => fitToChip(pair(full), interleaverChip, OUT1))).toMatchObject({ limit: 'RINGS' });
  });

  it('puts each ring where its coupling is in reach [cross-check]', () => {
    const couplers = [tunable('ring1', { maxCoupling: 0.4 }), tunable('ring2', { minCoupling: 0.35 })];
    const narrow = interferometer([ring(0.9, 0.4), ring(0.3, -1)], [ring(0.5, 2)]);
    expectAlike(narrow, oneCell({ couplers }), OUT1);
    const both = interferometer([ring(0.9, 0.4), ring(0.8, -1)], [ring(0.5, 2), ring(0.6, 2)]);
    const onlyOne = oneCell({
      couplers: [...couplers, ...[3, 4].map((k) => tunable(`ring${k}`, { maxCoupling: 0.7 }))],
    });
    expect(refusal(() => fitToChip(pair(both), onlyOne, OUT1))).toMatchObject({
      code: 'SPECIFICATION_UNREACHABLE',
      limit: 'COUPLING_RANGE',
    });
  });

  it('realises fixed couplers at their own value [cross-check]', () => {
    const ends = [fixed('input', 0.5), fixed('output', 0.5)];
    expectAlike(interferometer([ring(0.6, 0.4)], [ring(0.5, 2)]), oneCell({ couplers: ends }), OUT1);
  });

  it('refuses a ring that the loss of the chip undercouples [cross-check]', () => {
    // Source: K ≤ 1 − a², a² = 10^(−0.32/10) for 0.3 dB guide and 0.02 dB coupler a turn, is 0.0710 by hand.
    const lossy = inventChip({
      cells: [{ name: 'cell1', ringsPerArm: [1, 1] }],
      seed: 5,
      unitDelayLossDb: 0.3,
    });
    const narrow = (k: number) => pair(interferometer([ring(k, 0.4)], [ring(0.5, 2)]));
    const refused = refusal(() => fitToChip(narrow(0.0709), lossy, OUT1));
    expect(refused).toMatchObject({ limit: 'COUPLING_RANGE', given: 0.0709 });
    expect((refused.allowed as { above: number }).above).toBeCloseTo(0.07103, 4);
    expect(fitToChip(narrow(0.0712), lossy, OUT1).cells[0]!.rings[0]!.powerCrossCoupling).toBe(0.0712);
  });

  it('meets filters made elsewhere, pole by pole [cross-check]', () => {
    for (const [name, chip] of [
      ['butter3_half', interleaverChip],
      ['ellip4', sixRingChip],
      ['ellip5', sixRingChip],
    ] as const) {
      const filter = labelledFilter(name);
      const { interferometer: cell } = synthesiseAllPassPair(filter, 'OUT2');
      const { out2 } = fieldsOf(fitToChip(pair(cell), chip, { output: 'OUT2', parkAtRad: 1 }).circuit);
      const wanted = filter.response();
      expect(difference(out2, wanted)).toBeLessThan(1e-9);
    }
  });
});

describe('rings left over', () => {
  const leaky = (...rings: number[]) => rings.map((k) => tunable(`ring${k}`, { minCoupling: 0.01 * k }));

  it('cancel in pairs when they cannot decouple, one on each arm, equal and out of the way [cross-check]', () => {
    const chip = oneCell({ ringsPerArm: [2, 2], couplers: leaky(1, 2, 3, 4) });
    const placed = fitToChip(pair(interferometer([ring(0.6, 0.4)], [ring(0.5, 2)])), chip, OUT1);
    const spare = placed.cells[0]!.rings.filter(({ parked }) => parked);
    expect(spare.map(({ arm }) => arm)).toEqual([0, 1]);
    expect(spare[0]!.powerCrossCoupling).toBe(spare[1]!.powerCrossCoupling);
    const here = fieldsOf(placed.circuit);
    const ideal = fieldsOf({ cells: [interferometer([ring(0.6, 0.4)], [ring(0.5, 2)])], join: 'OUT1' });
    here.out1.re.forEach((re, k) => {
      const transmission = re * re + here.out1.im[k]! ** 2;
      expect(transmission).toBeCloseTo(ideal.out1.re[k]! ** 2 + ideal.out1.im[k]! ** 2, 12);
    });
  });

  it('are detuned to where the response does not matter when they have no partner [cross-check]', () => {
    const chip = oneCell({ ringsPerArm: [2, 1], couplers: [tunable('ring1', { minCoupling: 0.05 })] });
    const narrow = pair(interferometer([ring(0.04, 0.4)], [ring(0.045, 2)]));
    const placed = fitToChip(narrow, chip, OUT1);
    const [first, second] = placed.cells[0]!.rings;
    expect(first).toMatchObject({ parked: true, powerCrossCoupling: 0.05 });
    expect(second).toMatchObject({ parked: false });
    // Source: a ring is resonant where Ω + φ = 0 (src/conventions.ts).
    expect(Math.cos(first!.phaseRad + OUT1.parkAtRad)).toBeCloseTo(1, 12);
    expect(placed.parked[0]!.how).toContain('detuned');
  });

  it('are used rather than left over when they cannot decouple [cross-check]', () => {
    const chip = oneCell({ ringsPerArm: [2, 1], couplers: [tunable('ring1', { minCoupling: 0.05 })] });
    const placed = fitToChip(pair(interferometer([], [ring(0.5, 2)])), chip, OUT1);
    expect(placed.cells[0]!.rings.filter((one) => one.parked && one.powerCrossCoupling > 0)).toHaveLength(0);
    expectAlike(interferometer([], [ring(0.5, 2)]), chip, OUT1);
  });
});

describe('several cells', () => {
  it('joined by both guides hold one all-pass pair of all their rings [cross-check]', () => {
    const six = interferometer(
      [ring(0.6, 0.4), ring(0.3, -1), ring(0.2, 0)],
      [ring(0.8, 2), ring(0.5, 1), ring(0.4, -2)],
      { input: 0.45, output: 0.55 },
    );
    expectAlike(six, bothGuidesChip, OUT1);
    expectAlike(six, bothGuidesChip, { ...OUT1, carriedOn: 'OUT2' });
    expectAlike(interferometer([ring(0.6, 0.4)], [ring(0.8, 2)]), bothGuidesChip, OUT1);
  });

  it('joined by both guides refuse joining couplers that do not decouple [cross-check]', () => {
    const chip = inventChip({
      cells: [
        { name: 'first', ringsPerArm: [1, 1], couplers: [tunable('output', { minCoupling: 0.02 })] },
        { name: 'second', ringsPerArm: [1, 1] },
      ],
      join: 'BOTH',
      seed: 3,
    });
    const four = interferometer([ring(0.6, 0.4), ring(0.3, -1)], [ring(0.8, 2), ring(0.5, 1)]);
    expect(refusal(() => fitToChip(pair(four), chip, OUT1))).toMatchObject({
      limit: 'COUPLING_RANGE',
      element: 'first.output.coupling',
      given: 0,
    });
  });

  it('pass the light on where only one of them is needed, whichever output is asked for [cross-check]', () => {
    const cell = interferometer([ring(0.6, 0.4)], [ring(0.5, 2)]);
    for (const output of ['OUT1', 'OUT2'] as const) {
      expectAlike(cell, twoCellChip, { output, parkAtRad: 2 });
      const placed = fitToChip(pair(cell), twoCellChip, { output, parkAtRad: 2 });
      expect(placed.parked[0]!.element).toBe('front');
      expect(placed.cells[1]!.carries[output]).toBe('FILTER');
    }
  });

  it('put the filter into an earlier cell when only that has the rings, and lead it to the output [cross-check]', () => {
    const chip = inventChip({
      cells: [
        { name: 'front', ringsPerArm: [2, 1] },
        { name: 'back', ringsPerArm: [1, 0] },
      ],
      join: 'OUT1',
      seed: 4,
    });
    for (const output of ['OUT1', 'OUT2'] as const) {
      const placed = fitToChip(pair(unequal), chip, { output, carriedOn: 'OUT2', parkAtRad: 1 });
      const field = output === 'OUT1' ? fieldsOf(placed.circuit).out1 : fieldsOf(placed.circuit).out2;
      expect(difference(field, fieldsOf({ cells: [unequal], join: 'OUT1' }).out2)).toBeLessThan(ALIKE);
    }
    expect(refusal(() => fitToChip(pair(unequal), chip, { ...OUT1, bothOutputs: true }))).toMatchObject({
      limit: 'RINGS',
    });
  });

  it('with fixed 50/50 couplers pass the light through both arms [cross-check]', () => {
    const plain = [fixed('input', 0.5), fixed('output', 0.5)];
    const chip = inventChip({
      cells: [
        { name: 'front', ringsPerArm: [1, 1], couplers: plain },
        { name: 'back', ringsPerArm: [1, 1], couplers: plain },
      ],
      join: 'OUT1',
      seed: 6,
    });
    for (const output of ['OUT1', 'OUT2'] as const)
      expectAlike(interferometer([ring(0.6, 0.4)], [ring(0.5, 2)]), chip, { output, parkAtRad: 2 });
  });

  it('that let light through neither way refuse [cross-check]', () => {
    const chip = inventChip({
      cells: [
        {
          name: 'front',
          ringsPerArm: [0, 0],
          armDelay: [0, 1],
          couplers: [fixed('input', 0.5), fixed('output', 0.5)],
        },
        { name: 'back', ringsPerArm: [1, 1] },
      ],
      join: 'OUT1',
      seed: 6,
    });
    const refused = refusal(() =>
      fitToChip(pair(interferometer([ring(0.6, 0.4)], [ring(0.5, 2)])), chip, OUT1),
    );
    expect(refused).toMatchObject({ limit: 'COUPLING_RANGE' });
  });

  it('take one section of a cascade each, in an order that fits [cross-check]', () => {
    const broad = interferometer([ring(0.9, 0.4)], [ring(0.7, 2)], { phaseRad: 0.2 });
    const narrow = interferometer([ring(0.2, -1)], [ring(0.3, 1)], { phaseRad: 2.5 });
    const limited = inventChip({
      cells: [
        {
          name: 'front',
          ringsPerArm: [1, 1],
          couplers: [1, 2].map((k) => tunable(`ring${k}`, { maxCoupling: 0.5 })),
        },
        { name: 'back', ringsPerArm: [1, 1] },
      ],
      join: 'OUT2',
      seed: 4,
    });
    for (const chip of [twoCellChip, limited]) {
      const cells = [broad, narrow];
      const placed = fitToChip({ architecture: 'SECTION_CASCADE', cells }, chip, {
        ...OUT1,
        carriedOn: 'OUT1',
      });
      expect(placed.cells.map(({ section }) => section)).toEqual(chip === limited ? [2, 1] : [1, 2]);
      const { out1 } = fieldsOf(placed.circuit);
      const [one, two] = cells.map((cell) => fieldsOf({ cells: [cell], join: 'OUT1' }).out1);
      const product = {
        re: one!.re.map((re, k) => re * two!.re[k]! - one!.im[k]! * two!.im[k]!),
        im: one!.re.map((re, k) => re * two!.im[k]! + one!.im[k]! * two!.re[k]!),
      };
      expect(difference(out1, product)).toBeLessThan(ALIKE);
    }
    const three = { architecture: 'SECTION_CASCADE', cells: [broad, narrow, narrow] } as const;
    expect(refusal(() => fitToChip(three, twoCellChip, OUT1))).toMatchObject({
      limit: 'RINGS',
      given: 3,
      allowed: 2,
    });
    const two = { architecture: 'SECTION_CASCADE', cells: [broad, narrow] } as const;
    expect(refusal(() => fitToChip(two, bothGuidesChip, OUT1))).toMatchObject({ limit: 'RINGS' });
  });
});

describe('ring capacity', () => {
  it('counts what each chip holds [cross-check]', () => {
    // Source: counting by hand; the interleaver chip's delay costs a ring unless the filter wants it.
    expect(ringCapacity(sixRingChip).allPassPair).toEqual({
      order: 6,
      halfBandOrder: 5,
      arms: [3, 3],
      cells: ['main'],
    });
    expect(ringCapacity(interleaverChip).allPassPair).toMatchObject({ order: 3, halfBandOrder: 5 });
    expect(ringCapacity(twoCellChip)).toMatchObject({
      allPassPair: { order: 2, cells: ['back'] },
      sectionCascade: { secondOrderSections: 2, firstOrderSections: 0, order: 4 },
    });
    expect(ringCapacity(bothGuidesChip)).toMatchObject({
      allPassPair: { order: 6, cells: ['first', 'second'] },
      sectionCascade: { secondOrderSections: 1 },
    });
  });
});
