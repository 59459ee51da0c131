/**
 * Input and output couplers that are not what the filter wants. Outside references: filters by SciPy, and the couplers'
 * matrices multiplied by hand: out1 = t_o·t_i·A₀ − κ_o·κ_i·A₁, out2 = −j(κ_o·t_i·A₀ + t_o·κ_i·A₁).
 */
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  type ChipModel,
  circuitOfSetting,
  type FitOptions,
  fitToChip,
  type PlacedCircuit,
  solveSetting,
} from '../../src/chip/index.ts';
import {
  type ComplexSeries,
  createFieldBuffers,
  createKernel,
  evaluateInto,
} from '../../src/circuit/index.ts';
import type { OutputPort } from '../../src/filter/index.ts';
import { synthesiseAllPassPair } from '../../src/synthesis/index.ts';
import { builtNetlist, difference, fieldsOf, OMEGAS, outputsOf } from './fields.ts';
import { fixed, ideally, inventChip, spread, tunable } from './invented-chips.ts';
import { labelledFilter } from './reference-filters.ts';

/** Order 5, equal-ripple nulls on the unit circle; SciPy's zeros and poles are known to about 1e-12. */
const FILTER = labelledFilter('ellip5');
const AS_PUBLISHED = 1e-9;

/** Null powers of filter zeros that SciPy rounds: squares of 1e-6 beside a floor of 0.0036. */
const AT_A_NULL = 1e-6;

/** Currents in steps of 1e-12 mA, square roots near dark couplers. */
const ROUND_TRIP = 1e-8;

const OUTPUTS = ['OUT1', 'OUT2'] as const;

const sixRings = (
  ...couplers: Parameters<typeof inventChip>[0]['cells'][0]['couplers'] & object
): ChipModel => inventChip({ cells: [{ name: 'main', ringsPerArm: [3, 3], couplers }], seed: 13 });

function place(chip: ChipModel, output: OutputPort, change: Partial<FitOptions> = {}): PlacedCircuit {
  const { interferometer: cell } = synthesiseAllPassPair(FILTER, output);
  return fitToChip({ architecture: 'ALL_PASS_PAIR', cell }, chip, { output, parkAtRad: 1.2, ...change });
}

const fieldAt = (placed: PlacedCircuit, port: OutputPort, omegas = OMEGAS): ComplexSeries => {
  const { out1, out2 } = fieldsOf(placed.circuit, omegas);
  return port === 'OUT1' ? out1 : out2;
};

const scaled = ({ re, im }: ComplexSeries, by: number): ComplexSeries => ({
  re: re.map((x) => x * by),
  im: im.map((x) => x * by),
});

/** Powers of an output where the filter that it should carry has its zeros. */
function nullPowers(placed: PlacedCircuit, port: OutputPort): number[] {
  const zeros = Float64Array.from(
    FILTER.zeros.filter((zero) => zero.im > 1e-3),
    (zero) => zero.arg(),
  );
  const { re, im } = fieldAt(placed, port, zeros);
  return Array.from(re, (x, k) => x * x + im[k]! ** 2);
}

const endsOf = ({ cells }: PlacedCircuit): [number, number] => [
  cells[0]!.inputCoupling,
  cells.at(-1)!.outputCoupling,
];

const offBalance = (placed: PlacedCircuit, chip: ChipModel): string[] =>
  solveSetting(placed, chip)
    .cautions.filter(({ code }) => code === 'COUPLER_OFF_BALANCE')
    .map(({ text }) => text);

describe('both end couplers fixed at 0.53', () => {
  const chip = sixRings(fixed('input', 0.53), fixed('output', 0.53));

  it('leave the filter on the cross output as published but for a constant 0.016 dB [cross-check]', () => {
    // Source: t_o·κ_i = κ_o·t_i = √(0.53·0.47), so that out2 is 2√(0.53·0.47) of the filter.
    const placed = place(chip, 'OUT2');
    expect(endsOf(placed)).toEqual([0.53, 0.53]);
    const gain = 2 * Math.sqrt(0.53 * 0.47);
    expect(difference(fieldAt(placed, 'OUT2'), scaled(FILTER.response(), gain))).toBeLessThan(AS_PUBLISHED);
    expect(nullPowers(placed, 'OUT2').every((power) => power < AT_A_NULL ** 2)).toBe(true);
  });

  it('fill the nulls of the bar output to −24 dB [cross-check]', () => {
    // Source: |t_o·t_i − κ_o·κ_i|² = (1 − 2·0.53)² = 0.0036, −24.4 dB.
    const powers = nullPowers(place(chip, 'OUT1'), 'OUT1');
    expect(powers.length).toBeGreaterThan(1);
    for (const power of powers) expect(Math.abs(power - 0.0036)).toBeLessThan(AT_A_NULL);
  });

  it('are told with element, wanted and taken coupling, and what they do to either output [cross-check]', () => {
    const [onCross, ...none] = offBalance(place(chip, 'OUT2'), chip);
    expect(none).toEqual([]);
    expect(onCross).toContain('main.input.coupling should be 0.5; it is fixed at 0.53.');
    expect(onCross).toContain('main.output.coupling should be 0.5; it is fixed at 0.53.');
    expect(onCross).toContain(
      'nulls of OUT2, which carries what is wanted, stay complete (peak lower by 0.016 dB)',
    );
    expect(onCross).toContain('nulls of OUT1 end at -24.4 dB');
    const [onBar] = offBalance(place(chip, 'OUT1'), chip);
    expect(onBar).toContain('nulls of OUT1, which carries what is wanted, end at -24.4 dB');
    expect(onBar).toContain('nulls of OUT2 stay complete');
  });

  it('exchange the outputs where they err to contrary sides [cross-check]', () => {
    // Source: 0.47 = 1 − 0.53 exchanges t and κ of one coupler, and with them the two outputs.
    const contrary = sixRings(fixed('input', 0.53), fixed('output', 0.47));
    const gain = 2 * Math.sqrt(0.53 * 0.47);
    const bar = fieldAt(place(contrary, 'OUT1'), 'OUT1');
    expect(difference(bar, scaled(FILTER.response(), gain))).toBeLessThan(AS_PUBLISHED);
    for (const power of nullPowers(place(contrary, 'OUT2'), 'OUT2'))
      expect(Math.abs(power - 0.0036)).toBeLessThan(AT_A_NULL);
  });

  it('are no caution where they are what is wanted, nor is a reach that includes it [cross-check]', () => {
    for (const exact of [sixRings(), sixRings(fixed('input', 0.5), fixed('output', 0.5))])
      for (const output of OUTPUTS) {
        expect(place(exact, output).offBalance).toEqual([]);
        expect(offBalance(place(exact, output), exact)).toEqual([]);
      }
  });
});

describe('one end coupler off', () => {
  it('is matched by the other where only one output counts, which keeps its filter [cross-check]', () => {
    // Source: out2 needs K_out = K_in, out1 needs K_out = 1 − K_in; either way 2√(K_in(1−K_in)) of the filter is left.
    fc.assert(
      fc.property(spread(0.3, 0.7), fc.constantFrom(...OUTPUTS), fc.boolean(), (k, output, first) => {
        const chip = sixRings(fixed(first ? 'input' : 'output', k));
        const placed = place(chip, output);
        const [taken, matched] = first ? endsOf(placed) : endsOf(placed).toReversed();
        expect(taken).toBe(k);
        expect(matched).toBeCloseTo(output === 'OUT2' ? k : 1 - k, 12);
        const wanted = scaled(FILTER.response(), 2 * Math.sqrt(k * (1 - k)));
        expect(difference(fieldAt(placed, output), wanted)).toBeLessThan(AS_PUBLISHED);
      }),
      { numRuns: 20 },
    );
  });

  it('is shared between the nulls where both outputs count [cross-check]', () => {
    // Source: with the other at 0.5 either output has |√0.47 − √0.53|²/2 left: 0.0009004, −30.5 dB.
    const chip = sixRings(fixed('input', 0.53));
    const floor = (Math.sqrt(0.47) - Math.sqrt(0.53)) ** 2 / 2;
    for (const output of OUTPUTS) {
      const placed = place(chip, output, { bothOutputs: true });
      expect(endsOf(placed)).toEqual([0.53, 0.5]);
      for (const power of nullPowers(placed, output)) expect(Math.abs(power - floor)).toBeLessThan(AT_A_NULL);
      expect(offBalance(placed, chip)[0]!.match(/end at -30\.5 dB/g)).toHaveLength(2);
    }
  });

  it('takes the end of a reach, and the other follows as far as it can [cross-check]', () => {
    const short = sixRings(tunable('input', { maxCoupling: 0.4 }), tunable('output', { minCoupling: 0.43 }));
    const placed = place(short, 'OUT2');
    expect(endsOf(placed)).toEqual([0.4, 0.43]);
    const [text] = offBalance(placed, short);
    expect(text).toContain('main.input.coupling should be 0.5; it reaches 0 to 0.4 and takes 0.4.');
    expect(text).toContain('main.output.coupling should be 0.5; it takes 0.43 to match the other end.');
  });
});

describe('any end couplers near what is wanted', () => {
  const ends = fc.record({
    input: spread(0.3, 0.7),
    output: spread(0.3, 0.7),
    port: fc.constantFrom(...OUTPUTS),
    both: fc.boolean(),
    tunableOutput: fc.boolean(),
    seed: fc.integer({ min: 1, max: 1000 }),
  });

  it('give a circuit that kernel, netlist solver and the heated chip as built agree on [property]', () => {
    fc.assert(
      fc.property(ends, ({ input, output, port, both, tunableOutput, seed }) => {
        const reach = output < 0.5 ? { maxCoupling: output } : { minCoupling: output };
        const couplers = [
          fixed('input', input),
          tunableOutput ? tunable('output', reach) : fixed('output', output),
        ];
        const cells = [{ name: 'main', ringsPerArm: [3, 2] as const, couplers }];
        const chip = ideally(inventChip({ cells, seed }));
        const placed = place(chip, port, { bothOutputs: both });
        const solved = fieldsOf(placed.circuit);
        const kernel = createFieldBuffers(OMEGAS.length);
        evaluateInto(createKernel(placed.circuit), OMEGAS, kernel);
        expect(difference({ re: kernel.out1Re, im: kernel.out1Im }, solved.out1)).toBeLessThan(1e-12);
        expect(difference({ re: kernel.out2Re, im: kernel.out2Im }, solved.out2)).toBeLessThan(1e-12);
        const setting = solveSetting(placed, chip);
        const phases = setting.channels.map(({ phaseRad }) => phaseRad);
        const built = outputsOf(builtNetlist(chip, phases));
        const here = fieldsOf(circuitOfSetting(setting, chip));
        for (const out of ['out1', 'out2'] as const) {
          expect(difference(here[out], solved[out])).toBeLessThan(ROUND_TRIP);
          expect(difference(built[out], solved[out])).toBeLessThan(ROUND_TRIP);
        }
      }),
      { numRuns: 30 },
    );
  });

  it('leave in the nulls what their caution says [property]', () => {
    fc.assert(
      fc.property(ends, ({ input, output, port }) => {
        const chip = sixRings(fixed('input', input), fixed('output', output));
        const placed = place(chip, port);
        const text = offBalance(placed, chip)[0] ?? '';
        const said = text.match(
          new RegExp(`nulls of ${port}, which carries what is wanted, end at (-[\\d.]+) dB`),
        );
        const floor = said ? 10 ** (Number(said[1]) / 10) : 0;
        // Said to 0.1 dB: 1.2 % of a power either way.
        for (const power of nullPowers(placed, port))
          expect(Math.abs(power - floor)).toBeLessThan(0.012 * floor + AT_A_NULL);
      }),
      { numRuns: 30 },
    );
  });
});
