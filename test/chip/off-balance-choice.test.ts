/**
 * Which placement is taken where input and output couplers are not all what is wanted, and what is refused. Outside
 * reference: responses by the general solver; choices and bounds are those of the words of the contract.
 */
import { describe, expect, it } from 'vitest';
import {
  type ChipModel,
  type FitOptions,
  fitToChip,
  ringCapacity,
  solveSetting,
} from '../../src/chip/index.ts';
import type { ComplexSeries, InterferometerParameters, RingParameters } from '../../src/circuit/index.ts';
import { Refusal, type RefusalDetails } from '../../src/errors.ts';
import type { OutputPort } from '../../src/filter/index.ts';
import { difference, fieldsOf } from './fields.ts';
import { type CellChoice, fixed, inventChip, tunable } from './invented-chips.ts';

/** Both sides go through the general solver: a dozen elements, rings no narrower than K = 0.2. */
const ALIKE = 1e-12;

const ring = (powerCrossCoupling: number, phaseRad: number): RingParameters => ({
  powerCrossCoupling,
  phaseRad,
  lossDb: 0,
  delay: 1,
});

const interferometer = (
  rings: readonly [number, number],
  inputCoupling = 0.5,
  outputCoupling = 0.5,
): InterferometerParameters => ({
  inputCoupling,
  outputCoupling,
  arms: [
    { rings: [ring(rings[0], 0.4)], delay: 0, phaseRad: 0, lossDb: 0 },
    { rings: [ring(rings[1], 2)], delay: 0, phaseRad: 0.9, lossDb: 0 },
  ],
  couplerExcessLossDb: 0,
});

const balanced = interferometer([0.6, 0.5]);
const at = (output: OutputPort): FitOptions => ({ output, parkAtRad: 2.1 });
const fitPair = (cell: InterferometerParameters, chip: ChipModel, options: FitOptions) =>
  fitToChip({ architecture: 'ALL_PASS_PAIR', cell }, chip, options);

const ends = (input: number, output: number) => [fixed('input', input), fixed('output', output)];
const reaching = (minCoupling: number, maxCoupling: number) =>
  ['input', 'output'].map((name) => tunable(name, { minCoupling, maxCoupling }));
const oneCell = (change: Partial<CellChoice> = {}): ChipModel =>
  inventChip({ cells: [{ name: 'main', ringsPerArm: [1, 1], ...change }], seed: 5 });
const twoCells = (
  front: Partial<CellChoice>,
  back: Partial<CellChoice>,
  join: 'OUT1' | 'OUT2' | 'BOTH' = 'OUT2',
): ChipModel =>
  inventChip({
    cells: [
      { name: 'front', ringsPerArm: [1, 1], ...front },
      { name: 'back', ringsPerArm: [1, 1], ...back },
    ],
    join,
    seed: 6,
  });

const scaled = ({ re, im }: ComplexSeries, by: number): ComplexSeries => ({
  re: re.map((x) => x * by),
  im: im.map((x) => x * by),
});
const alone = (cell: InterferometerParameters) => fieldsOf({ cells: [cell], join: 'OUT1' });

const cautions = (placed: ReturnType<typeof fitToChip>, chip: ChipModel): string[] =>
  solveSetting(placed, chip)
    .cautions.filter(({ code }) => code === 'COUPLER_OFF_BALANCE')
    .map(({ text }) => text);

function refusal(work: () => unknown): RefusalDetails {
  try {
    work();
  } catch (reason) {
    if (reason instanceof Refusal) return reason.details;
    throw reason;
  }
  throw new Error('nothing was refused');
}

describe('a placement with exact couplers is taken before one without', () => {
  it('by exchanging the arms [cross-check]', () => {
    // Source: exchanged arms want 1 − K at both ends, here 0.63 and 0.42.
    const unequal = interferometer([0.6, 0.5], 0.37, 0.58);
    for (const couplers of [ends(0.37, 0.58), ends(0.63, 0.42)]) {
      const placed = fitPair(unequal, oneCell({ couplers }), at('OUT1'));
      expect(placed.offBalance).toEqual([]);
      expect(difference(fieldsOf(placed.circuit).out1, alone(unequal).out1)).toBeLessThan(ALIKE);
    }
  });

  it('by using another cell [cross-check]', () => {
    const chip = twoCells({}, { couplers: reaching(0, 0.45) });
    const placed = fitPair(balanced, chip, at('OUT1'));
    expect(placed.parked[0]!.element).toBe('back');
    expect(placed.offBalance).toEqual([]);
    expect(cautions(placed, chip)).toEqual([]);
    expect(difference(fieldsOf(placed.circuit).out1, alone(balanced).out1)).toBeLessThan(ALIKE);
  });

  it('by another order of sections [cross-check]', () => {
    const sections = [interferometer([0.6, 0.5], 0.4, 0.4), interferometer([0.3, 0.7])];
    const chip = twoCells({ couplers: ends(0.5, 0.5) }, { couplers: ends(0.4, 0.4) });
    const placed = fitToChip({ architecture: 'SECTION_CASCADE', cells: sections }, chip, at('OUT2'));
    expect(placed.cells.map(({ section }) => section)).toEqual([2, 1]);
    expect(placed.offBalance).toEqual([]);
  });

  it('and of two without, the one that leaves the null of the output in use [cross-check]', () => {
    // Source: the cross output needs K_in = K_out. A cell that passes light on may be either, at a constant loss.
    const pairs = [ends(0.53, 0.53), ends(0.53, 0.47)] as const;
    for (const [front, back, used] of [
      [pairs[0], pairs[1], 'front'],
      [pairs[1], pairs[0], 'back'],
    ] as const) {
      const chip = twoCells({ couplers: front }, { couplers: back });
      const placed = fitPair(balanced, chip, at('OUT2'));
      expect(placed.parked[0]!.element).not.toBe(used);
    }
  });
});

describe('cells in a row with couplers off', () => {
  it('pass the light on by both arms at a constant loss that is told [cross-check]', () => {
    // Source: K 0.53 twice leaves t_o·κ_i + κ_o·t_i = 2√(0.53·0.47) of the field to out2, and 1 − 2·0.53 of it on out1.
    const chip = twoCells({ couplers: ends(0.53, 0.53) }, { couplers: ends(0.53, 0.53) });
    const placed = fitPair(balanced, chip, at('OUT2'));
    const gain = (2 * Math.sqrt(0.53 * 0.47)) ** 2;
    expect(difference(fieldsOf(placed.circuit).out2, scaled(alone(balanced).out2, gain))).toBeLessThan(ALIKE);
    const [front, back, ...none] = cautions(placed, chip);
    expect(none).toEqual([]);
    expect(front).toMatch(/^front\.input\.coupling should be 0\.5; it is fixed at 0\.53\./);
    expect(front).toMatch(
      /front passes light on by OUT2 \(peak lower by 0\.016 dB\); -24\.4 dB of it leaves by OUT1\.$/,
    );
    expect(back).toMatch(/nulls of OUT2, which carries what is wanted, stay complete/);
  });

  it('take a section each, and each is told [cross-check]', () => {
    const chip = twoCells({ couplers: ends(0.53, 0.53) }, { couplers: ends(0.47, 0.47) });
    const sections = [balanced, interferometer([0.3, 0.7])];
    const placed = fitToChip({ architecture: 'SECTION_CASCADE', cells: sections }, chip, at('OUT2'));
    expect(placed.cells.map(({ section }) => section)).toEqual([1, 2]);
    expect(cautions(placed, chip)).toHaveLength(2);
    const [one, two] = sections.map((cell) => alone(cell).out2);
    const product = {
      re: one!.re.map((re, k) => re * two!.re[k]! - one!.im[k]! * two!.im[k]!),
      im: one!.re.map((re, k) => re * two!.im[k]! + one!.im[k]! * two!.re[k]!),
    };
    const gain = (2 * Math.sqrt(0.53 * 0.47)) ** 2;
    expect(difference(fieldsOf(placed.circuit).out2, scaled(product, gain))).toBeLessThan(ALIKE);
  });

  it('joined by both guides have their ends off at the first and the last [cross-check]', () => {
    const chip = twoCells(
      { couplers: [fixed('input', 0.53)] },
      { couplers: [fixed('output', 0.53)] },
      'BOTH',
    );
    const four: InterferometerParameters = {
      ...balanced,
      arms: [
        { ...balanced.arms[0], rings: [ring(0.6, 0.4), ring(0.3, -1)] },
        { ...balanced.arms[1], rings: [ring(0.5, 2), ring(0.8, 1)] },
      ],
    };
    const placed = fitPair(four, chip, at('OUT2'));
    const wanted = scaled(alone(four).out2, 2 * Math.sqrt(0.53 * 0.47));
    expect(difference(fieldsOf(placed.circuit).out2, wanted)).toBeLessThan(ALIKE);
    const [text, ...none] = cautions(placed, chip);
    expect(none).toEqual([]);
    expect(text).toContain('front.input.coupling should be 0.5');
    expect(text).toContain('back.output.coupling should be 0.5');
  });
});

describe('what is refused', () => {
  const refused = { code: 'SPECIFICATION_UNREACHABLE', limit: 'COUPLING_RANGE' };

  it('an end coupler further than 0.2 from what is wanted, with its numbers [cross-check]', () => {
    for (const k of [0.3, 0.7])
      expect(fitPair(balanced, oneCell({ couplers: ends(k, k) }), at('OUT2')).offBalance).toHaveLength(1);
    for (const k of [0.299, 0.701]) {
      const details = refusal(() => fitPair(balanced, oneCell({ couplers: ends(0.5, k) }), at('OUT2')));
      expect(details).toMatchObject({
        ...refused,
        element: 'main.output.coupling',
        given: 0.5,
        allowed: { min: k, max: k },
      });
      expect(details.detail).toContain(`is fixed at ${k}`);
      expect(details.detail).toContain('up to 0.2');
    }
    for (const [min, max] of [
      [0, 0.299],
      [0.701, 1],
    ] as const)
      expect(
        refusal(() => fitPair(balanced, oneCell({ couplers: reaching(min, max) }), at('OUT2'))),
      ).toMatchObject({
        ...refused,
        given: 0.5,
        allowed: { min, max },
      });
  });

  it('a matching coupler is not moved beyond its reach, nor by more than 0.2 [cross-check]', () => {
    const couplers = [fixed('input', 0.65), tunable('output', { maxCoupling: 0.6 })];
    expect(fitPair(balanced, oneCell({ couplers }), at('OUT2')).cells[0]!.outputCoupling).toBe(0.6);
    // Source: out2 keeps its shape while K_i/(1−K_i) and K_o/(1−K_o) change by one factor, here 8/3: 0.5 → 0.727.
    const far = interferometer([0.6, 0.5], 0.2, 0.5);
    const placed = fitPair(far, oneCell({ couplers: [fixed('input', 0.4)] }), at('OUT2'));
    expect(placed.cells[0]!.outputCoupling).toBeCloseTo(0.7, 12);
    // And by 12/7 for 0.2 → 0.3: 0.5 → 12/19.
    const matched = fitPair(far, oneCell({ couplers: [fixed('input', 0.3)] }), at('OUT2'));
    expect(matched.cells[0]!.outputCoupling).toBeCloseTo(12 / 19, 12);
    const shape = fieldsOf(matched.circuit).out2;
    const wanted = alone(far).out2;
    // Source: weights κ_o·t_i before and after, √(0.5·0.8) and √(12/19·0.7).
    expect(difference(shape, scaled(wanted, Math.sqrt((12 / 19) * 0.7) / Math.sqrt(0.4)))).toBeLessThan(
      ALIKE,
    );
  });

  it('a cell that would have to pass the light by couplers too far apart [cross-check]', () => {
    const chip = twoCells({ ringsPerArm: [0, 0], couplers: ends(0.72, 0.72) }, {});
    expect(refusal(() => fitPair(balanced, chip, at('OUT2')))).toMatchObject({ ...refused });
  });

  it('a ring coupler that misses what its ring wants at all, but not one that ends a hair short of it [cross-check]', () => {
    const fixedRing = oneCell({ couplers: [fixed('ring1', 0.61)] });
    expect(refusal(() => fitPair(balanced, fixedRing, at('OUT2')))).toMatchObject({ ...refused, given: 0.6 });
    const hair = oneCell({ couplers: [tunable('ring1', { maxCoupling: 0.6 * (1 - 1e-10) })] });
    expect(fitPair(balanced, hair, at('OUT2')).cells[0]!.rings[0]!.powerCrossCoupling).toBe(
      0.6 * (1 - 1e-10),
    );
    // A pole at 0 wants K = 1: the reach of two inner couplers of 0.5 may end a rounding error below.
    const full = [1, 2, 3].map((k) => tunable(`ring${k}`, { maxCoupling: 1 - 1e-10 }));
    const delayed = oneCell({ ringsPerArm: [2, 1], armDelay: [0, 1], couplers: full });
    expect(ringCapacity(delayed).allPassPair.order).toBe(2);
  });
});
