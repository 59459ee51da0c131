import { describe, expect, it } from 'vitest';
import { type ChipModelInput, chipModelOf, chipModelRule } from '../../schema/chip.ts';
import { pointerOf, withEdits } from '../../schema/pointer.ts';
import { smallModel } from './invented-models.ts';

function issuesOf(edits: readonly { pointer: string; works: unknown }[]): string[] {
  const read = chipModelRule.safeParse(withEdits(smallModel(), edits));
  return read.success ? [] : read.error.issues.map((issue) => pointerOf(issue.path));
}

const CELL = '/cells/0/interferometer';

describe('a chip model', () => {
  it('[property] is taken when its parts agree', () => {
    expect(issuesOf([])).toEqual([]);
  });

  it.each([
    ['a channel that drives nothing', '/channels/2/drives', 'cell1.ring9.phase', '/channels/2/drives'],
    [
      'a channel that drives a fixed coupler',
      '/channels/2/drives',
      'cell1.output.coupling',
      '/channels/2/drives',
    ],
    ['two channels of one name', '/channels/1/channel', '01', '/channels/1/channel'],
    ['two channels on one element', '/channels/1/drives', 'cell1.input.coupling', '/channels/1/drives'],
    ['an element without a channel', '/channels/5', null, '/channels'],
    [
      'a coupler of a ring that is not there',
      `${CELL}/couplers/2/element`,
      'ring3',
      `${CELL}/couplers/2/element`,
    ],
    ['a ring without its coupler', `${CELL}/couplers/2`, null, `${CELL}/couplers`],
    [
      'a fixed coupler without its K',
      `${CELL}/couplers/3/powerCrossCoupling`,
      null,
      `${CELL}/couplers/3/powerCrossCoupling`,
    ],
    [
      'a tunable coupler with a K',
      `${CELL}/couplers/0/powerCrossCoupling`,
      0.5,
      `${CELL}/couplers/0/powerCrossCoupling`,
    ],
    [
      'a coupler whose reach is empty',
      `${CELL}/couplers/0/minCoupling`,
      0.995,
      `${CELL}/couplers/0/minCoupling`,
    ],
    ['a step above the current limit', '/channels/0/resolutionMa', 30, '/channels/0/resolutionMa'],
    ['a step that six decimals cannot tell', '/channels/0/resolutionMa', 1e-6, '/channels/0/resolutionMa'],
    ['a current limit of zero', '/channels/0/currentLimitMa', 0, '/channels/0/currentLimitMa'],
    ['a resistance below zero', '/channels/0/resistanceOhm', -500, '/channels/0/resistanceOhm'],
    ['a K above one', `${CELL}/couplers/3/powerCrossCoupling`, 1.2, `${CELL}/couplers/3/powerCrossCoupling`],
    ['a reference in nm', '/referenceFrequencyThz', 1552.5, '/referenceFrequencyThz'],
    ['a crosstalk matrix that is not square', '/crosstalk', [[1]], '/crosstalk'],
    ['a member nobody knows', '/losses/bendLossDb', 0.1, '/losses'],
  ])('[property] is refused with %s', (_, pointer, works, expected) => {
    expect(issuesOf([{ pointer, works }])).toContain(expected);
  });

  it.each([
    ['off its diagonal', 0, 1, 1.2, '/crosstalk/0/1'],
    ['on its diagonal', 2, 2, 0.9, '/crosstalk/2/2'],
    ['in the sum of a row', 3, 0, 1, '/crosstalk/3'],
  ])('[property] is refused with a crosstalk matrix that is too strong %s', (_, i, j, value, expected) => {
    const crosstalk = smallModel().channels.map((__, row) =>
      smallModel().channels.map((___, column) =>
        row === i && column === j ? value : row === column ? 1 : 0,
      ),
    );
    expect(issuesOf([{ pointer: '/crosstalk', works: crosstalk }])).toContain(expected);
  });

  it('[property] gets identity crosstalk, whole reach and a heater floor where nothing is said', () => {
    const model = chipModelOf(smallModel());
    expect(model.crosstalk).toHaveLength(36);
    expect(model.crosstalk.reduce((sum, value) => sum + value, 0)).toBe(6);
    expect(model.cells[0]?.couplers.map((c) => [c.minCoupling, c.maxCoupling])).toEqual([
      [0.01, 0.99],
      [0, 1],
      [0, 1],
      [0.5, 0.5],
    ]);
    expect(model).toMatchObject({ join: 'OUT1', heaterFloorRad: 0.5, fsrGhz: 50 });
  });

  it('[published] takes its free spectral range from c/(n·L): 50 GHz for 1500 µm at a group index near 4', () => {
    // c = 299 792 458 m/s (SI Brochure, 9th edition, 2019).
    const delay = { unitDelayLengthUm: 1500, groupIndex: 299_792_458 / (1500e-6 * 50e9) };
    const model: ChipModelInput = { ...smallModel(), fsr: { delay } };
    expect(chipModelRule.safeParse(model).success).toBe(true);
    expect(chipModelOf(model).fsrGhz).toBeCloseTo(50, 12);
  });
});
