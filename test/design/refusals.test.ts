/**
 * What the chip itself refuses, after the closed forms have agreed: the reason is the one that stands in the way, and
 * every suggestion really fits. No outside reference: the properties are those of the words of the refusal.
 */
import { describe, expect, it } from 'vitest';
import type { ChipModel } from '../../src/chip/index.ts';
import { checkQuestion, computeDesign, type DesignQuestion } from '../../src/design/index.ts';
import { Refusal, type Suggestion } from '../../src/errors.ts';
import type { FamilySpecification } from '../../src/filter/index.ts';
import { fixed, inventChip, tunable } from '../chip/invented-chips.ts';
import { pass, stop } from './designs.ts';

const family = (change: Partial<FamilySpecification> = {}): DesignQuestion => ({
  specification: {
    family: {
      family: 'ELLIPTIC',
      shape: 'LOW_PASS',
      order: 4,
      centreGhz: 0,
      band: { lowGhz: -12.5, highGhz: 12.5 },
      rippleDb: 1,
      rejectionDb: 30,
      output: 'OUT1',
      ...change,
    },
  },
  synthesis: {},
});

function refusalOf(question: DesignQuestion, chip: ChipModel): Refusal['details'] {
  try {
    computeDesign(question, chip);
  } catch (error) {
    if (error instanceof Refusal) return error.details;
    throw error;
  }
  throw new Error('was not refused');
}

/** Suggestions of the family form name its members. */
function applied(question: DesignQuestion, { changes }: Suggestion): DesignQuestion {
  const copy = structuredClone(question) as unknown as {
    specification: { family: Record<string, unknown> };
    synthesis: Record<string, unknown>;
  };
  for (const { pointer, works } of changes) {
    const member = pointer.split('/').at(-1)!;
    if (pointer.startsWith('/synthesis')) copy.synthesis[member] = works;
    else copy.specification.family[member] = works;
  }
  return copy as unknown as DesignQuestion;
}

const oneCell = (change: Partial<Parameters<typeof inventChip>[0]> = {}): ChipModel =>
  inventChip({ seed: 3, crosstalk: 0.02, cells: [{ name: 'c1', ringsPerArm: [2, 2] }], ...change });

describe('a filter that the chip cannot be made into', () => {
  it('[regression] is refused for its coupling, not for a cascade that nobody asked for', () => {
    const details = refusalOf(family(), oneCell({ unitDelayLossDb: 6 }));
    expect(details).toMatchObject({ code: 'SPECIFICATION_UNREACHABLE', limit: 'COUPLING_RANGE' });
    expect(details.detail).toMatch(/c1\.ring\d\.coupling would have to be/);
  });

  it.each([
    [
      'a band too narrow for the loss',
      family({ band: { lowGhz: -0.05, highGhz: 0.05 } }),
      oneCell({ unitDelayLossDb: 0.1 }),
    ],
    [
      'a band so wide that its rings are undercoupled',
      family({ band: { lowGhz: -49.99, highGhz: 49.99 } }),
      oneCell({ unitDelayLossDb: 0.1 }),
    ],
    [
      'couplers with narrow reach',
      family({ band: { lowGhz: -4, highGhz: 4 } }),
      oneCell({
        cells: [
          {
            name: 'c1',
            ringsPerArm: [2, 2],
            couplers: [1, 2, 3, 4].map((k) => tunable(`ring${k}`, { minCoupling: 0.3, maxCoupling: 0.9 })),
          },
        ],
      }),
    ],
  ])('[property] is refused with what fits: %s', (_, question, chip) => {
    const { nearest = [] } = refusalOf(question, chip);
    expect(nearest.length).toBeGreaterThan(0);
    for (const suggestion of nearest)
      expect(computeDesign(applied(question, suggestion), chip).order).toBeGreaterThan(0);
  });

  it('[property] is refused without a suggestion where none of those tried fits', () => {
    const couplers = ['input', 'output'].map((name) => fixed(name, 0.75));
    const chip = oneCell({ cells: [{ name: 'c1', ringsPerArm: [2, 2], couplers }] });
    expect(refusalOf(family(), chip).nearest).toEqual([]);
  });
});

describe('limits and losses that leave nothing', () => {
  it.each([
    ['100 dB a turn', { unitDelayLossDb: 100 }],
    ['30 dB a turn', { unitDelayLossDb: 30 }],
    ['couplers of 100 dB', { couplerExcessLossDb: 100 }],
  ])('[regression] are refused and are no failure of a solver: %s', (_, losses) => {
    for (const order of [1, 2, 4])
      expect(refusalOf(family({ order }), oneCell(losses))).toMatchObject({
        code: 'SPECIFICATION_UNREACHABLE',
        limit: 'COUPLING_RANGE',
      });
  });

  it('[regression] say that the driver step is in the way where the limit itself is not', () => {
    const chip = oneCell({ resolutionMa: 17 });
    const steps = chip.channels.map((channel) => ({ ...channel, currentLimitMa: 16.5 }));
    const details = refusalOf(family({ order: 2, rejectionDb: 20 }), { ...chip, channels: steps });
    expect(details).toMatchObject({ code: 'SETTING_UNREACHABLE', limit: 'CHANNEL_CURRENT', allowed: 0 });
    expect(details.detail).toMatch(/in steps of 17 mA its driver gives 0 mA/);
    expect(details.given).toBeGreaterThan(0);
  });

  it('[property] tell need and limit apart, however little is missing', () => {
    const question = family({ order: 2, rejectionDb: 20 });
    const chip = oneCell({ resolutionMa: 1e-5 });
    const limited = (currentLimitMa: number): ChipModel => ({
      ...chip,
      channels: chip.channels.map((channel) => ({ ...channel, currentLimitMa })),
    });
    const isRefused = (limit: number): boolean => {
      try {
        computeDesign(question, limited(limit));
        return false;
      } catch (error) {
        if (error instanceof Refusal) return true;
        throw error;
      }
    };
    let [refused, works] = [1, 20];
    for (let k = 0; k < 24; k++) {
      const middle = (refused + works) / 2;
      if (isRefused(middle)) refused = middle;
      else works = middle;
    }
    expect(works - refused).toBeLessThan(1e-5);
    const short = refusalOf(question, limited(refused));
    const [need, limit] = short.detail.match(/[\d.]+(?= mA[,;.])/g)!.map(Number);
    expect(need).toBeGreaterThan(limit!);
  });
});

describe('how much a chip holds', () => {
  const order = (most: number, chip: ChipModel): unknown => {
    try {
      return checkQuestion(family({ order: most }), chip).order;
    } catch (error) {
      if (error instanceof Refusal) return error.details.allowed;
      throw error;
    }
  };

  it('[regression] a plain delay is the pole at 0 of half-band filters, and of no others', () => {
    const chip = oneCell({ cells: [{ name: 'c1', ringsPerArm: [2, 2], armDelay: [0, 1] }] });
    expect(order(4, chip)).toEqual({ min: 1, max: 3 });
    const { centreGhz, output } = { centreGhz: 0, output: 'OUT1' } as const;
    const interleaver = {
      family: 'ELLIPTIC',
      shape: 'INTERLEAVER',
      order: 5,
      rejectionDb: 25,
      centreGhz,
      output,
    } as const;
    expect(checkQuestion({ specification: { family: interleaver }, synthesis: {} }, chip).order).toBe(5);
  });

  it('[regression] rings of two unit delays make no pole, and it is not suggested that they do', () => {
    const chip = oneCell({ cells: [{ name: 'c1', ringsPerArm: [1, 1], ringDelay: 2 }] });
    expect(order(2, chip)).toEqual({ maxOrder: 0 });
  });

  it('[regression] a mask asked for at more order than there is names both, and offers no change that changes nothing', () => {
    const bands = [pass(-10, 10, -1), stop(25, 75, -20)];
    const mask = { bands, reference: 'INPUT', order: 9 } as const;
    const { detail, nearest } = refusalOf({ specification: { mask }, synthesis: {} }, oneCell());
    expect(detail).toMatch(/^Order 9 is asked for; the mask needs order 2 .*order 4 at the most/);
    expect(nearest?.map(({ reason }) => reason)).toEqual(['order 2']);
  });

  it('[regression] an interleaver as a cascade is refused at once, and the pair that is suggested is accepted', () => {
    const chip = oneCell({ cells: [{ name: 'c1', ringsPerArm: [2, 2] }] });
    const interleaver = {
      family: 'ELLIPTIC',
      shape: 'INTERLEAVER',
      order: 3,
      rejectionDb: 20,
      centreGhz: 0,
      output: 'OUT1',
    } as const;
    const question: DesignQuestion = {
      specification: { family: interleaver },
      synthesis: { architecture: 'SECTION_CASCADE' },
    };
    expect(() => checkQuestion(question, chip)).toThrow(/needs an all-pass pair/);
    const { pointer, nearest } = refusalOf(question, chip);
    expect(pointer).toBe('/synthesis/architecture');
    expect(checkQuestion(applied(question, nearest![0]!), chip).order).toBe(3);
  });
});

describe('the words of a finished design', () => {
  it('[regression] say when driver steps undo what the filter would meet', () => {
    const bands = [pass(-10, 10, -0.6), stop(30, 70, -20)];
    const mask: DesignQuestion = { specification: { mask: { bands, reference: 'INPUT' } }, synthesis: {} };
    const { reason, compliance } = computeDesign(mask, oneCell({ resolutionMa: 0.4, unitDelayLossDb: 0.02 }));
    expect(compliance.met).toBe(false);
    expect(reason).toMatch(/misses/);
  });

  it('[regression] count the rings in use, not the order, where a plain delay is the pole at 0', () => {
    const chip = oneCell({ cells: [{ name: 'c1', ringsPerArm: [2, 2], armDelay: [0, 1] }] });
    const interleaver = {
      family: 'ELLIPTIC',
      shape: 'INTERLEAVER',
      order: 5,
      rejectionDb: 25,
      centreGhz: 0,
      output: 'OUT1',
    } as const;
    const { alternatives } = computeDesign({ specification: { family: interleaver }, synthesis: {} }, chip);
    expect(alternatives[0]).toMatchObject({ order: 5, rings: 4 });
  });
});

describe('numbers that no design can have', () => {
  it.each([
    ['a ripple lost in rounding', family({ rippleDb: 1e-300 }), '/specification/family/rippleDb'],
    [
      'a band without a width that counts',
      family({ band: { lowGhz: -5e-324, highGhz: 5e-324 } }),
      '/specification/family',
    ],
    [
      'a band narrower than any pole',
      family({ band: { lowGhz: -1e-9, highGhz: 1e-9 } }),
      '/specification/family',
    ],
    [
      'a band of an FSR, off its centre',
      family({ band: { lowGhz: -51, highGhz: 49.5 } }),
      '/specification/family/band',
    ],
  ])('[regression] are refused with their place: %s', (_, question, pointer) => {
    const details = refusalOf(question, oneCell());
    expect(details.pointer).toBe(pointer);
    for (const suggestion of details.nearest ?? [])
      expect(() => checkQuestion(applied(question, suggestion), oneCell())).not.toThrow();
  });
});
