import { describe, expect, it } from 'vitest';
import { listElements } from '../../src/chip/index.ts';
import { fixed, inventChip } from './invented-chips.ts';

describe('elements of a chip', () => {
  it('are named cell by cell, with the channel that drives each and none for fixed couplers [cross-check]', () => {
    // Source: the naming of the chip model, written out by hand.
    const chip = inventChip({
      cells: [
        { name: 'cell1', ringsPerArm: [1, 0], couplers: [fixed('input', 0.5)] },
        { name: 'cell2', ringsPerArm: [0, 0] },
      ],
      seed: 1,
    });
    const elements = listElements(chip);
    expect(elements.map(({ path }) => path)).toEqual([
      'cell1.input.coupling',
      'cell1.output.coupling',
      'cell1.ring1.coupling',
      'cell1.ring1.phase',
      'cell1.arm.phase',
      'cell2.input.coupling',
      'cell2.output.coupling',
      'cell2.arm.phase',
    ]);
    for (const { path, channel, coupler, kind } of elements) {
      expect(coupler !== null).toBe(kind === 'COUPLING');
      if (path === 'cell1.input.coupling') expect(channel).toBeNull();
      else expect(chip.channels[channel!]!.drives).toBe(path);
    }
  });
});
