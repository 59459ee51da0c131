/** Chips whose input and output couplers are not 0.5: designed as well as they can be, and judged as they are. */
import { describe, expect, it } from 'vitest';
import type { ChipModel } from '../../src/chip/index.ts';
import { computeDesign, type Design } from '../../src/design/index.ts';
import type { FilterSpecification } from '../../src/filter/index.ts';
import { fixed, inventChip } from '../chip/invented-chips.ts';
import { pass, stop } from './designs.ts';

const chipWith = (input: number, output: number): ChipModel =>
  inventChip({
    seed: 3,
    unitDelayLossDb: 0.01,
    couplerExcessLossDb: 0.005,
    resolutionMa: 1e-5,
    cells: [{ name: 'c1', ringsPerArm: [2, 2], couplers: [fixed('input', input), fixed('output', output)] }],
  });

/** One output's demand of 20 dB and of 30 dB: above and below what 1 − 2·0.53 of the field leaves, −24.4 dB. */
const rejecting = (dB: number, output: 'OUT1' | 'OUT2'): FilterSpecification => ({
  mask: { bands: [pass(-10, 10, -1.5, output), stop(30, 70, -dB, output)], reference: 'INPUT' },
});

const design = (specification: FilterSpecification, chip: ChipModel): Design =>
  computeDesign({ specification, synthesis: { architecture: 'ALL_PASS_PAIR' } }, chip);

const isTold = ({ setting }: Design): boolean =>
  setting.cautions.some(({ code }) => code === 'COUPLER_OFF_BALANCE');

describe('both end couplers fixed at 0.53', () => {
  it('keep the mask on the cross output, and on the bar output down to −24 dB only [cross-check]', () => {
    // Source: couplers' matrices multiplied by hand, see test/chip/balance.test.ts.
    const chip = chipWith(0.53, 0.53);
    for (const [dB, output, met] of [
      [30, 'OUT2', true],
      [20, 'OUT1', true],
      [30, 'OUT1', false],
    ] as const) {
      const here = design(rejecting(dB, output), chip);
      expect(here.compliance.met, `${dB} dB on ${output}`).toBe(met);
      expect(isTold(here)).toBe(true);
      expect(here.cells[0]).toMatchObject({ inputCoupling: 0.53, outputCoupling: 0.53 });
      if (met) continue;
      const stopband = here.compliance.bands.find(({ band }) => band.maxTransmissionDb !== undefined)!;
      // |0.47·A₀ − 0.53·A₁| is nowhere less than 0.06; losses take less than 0.3 dB off both arms.
      expect(stopband.reached).toBeGreaterThan(20 * Math.log10(0.06) - 0.3);
      expect(stopband.met).toBe(false);
    }
  });

  it('are no refusal of an interleaver, which uses both outputs [cross-check]', () => {
    const specification: FilterSpecification = {
      family: {
        family: 'ELLIPTIC',
        shape: 'INTERLEAVER',
        order: 3,
        rejectionDb: 20,
        centreGhz: 0,
        output: 'OUT2',
      },
    };
    const couplers = [fixed('input', 0.53), fixed('output', 0.53)];
    const chip = inventChip({
      seed: 3,
      cells: [{ name: 'c1', ringsPerArm: [2, 2], armDelay: [0, 1], couplers }],
    });
    expect(isTold(design(specification, chip))).toBe(true);
  });
});

describe('end couplers that are right', () => {
  it('carry no such caution [cross-check]', () => {
    expect(isTold(design(rejecting(30, 'OUT1'), chipWith(0.5, 0.5)))).toBe(false);
  });
});
