import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { channelLimit, currentMa, powerMw, roundToStep } from '../../src/chip/currents.ts';
import { phasesFromPowers } from '../../src/chip/heaters.ts';
import { invert, multiplyInto } from '../../src/chip/linear.ts';
import { inventChip } from './invented-chips.ts';

interface HeaterReference {
  readonly heater: {
    readonly values: readonly {
      readonly P_pi_mW: number;
      readonly R_ohm: number;
      readonly phi_over_pi: number;
      readonly P_mW: number;
      readonly I_mA: number;
    }[];
  };
  readonly crosstalk: {
    readonly crosstalk: readonly number[];
    readonly phasePerMw: readonly number[];
    readonly phaseAtZeroRad: readonly number[];
    readonly phaseRad: readonly number[];
    readonly powerMw: readonly number[];
    readonly inverse: readonly number[];
    readonly condition1: number;
  };
}

/** Sources: in the file. */
const reference = JSON.parse(
  readFileSync(new URL('../reference/chip-heaters.json', import.meta.url), 'utf8'),
) as HeaterReference;

/** A well-conditioned 5 × 5 system in doubles, twice. */
const SOLVED = 1e-11;

describe('heaters', () => {
  it('take current, power and phase by P = I²R and φ = π·P/P_π [published]', () => {
    for (const { P_pi_mW, R_ohm, phi_over_pi, P_mW, I_mA } of reference.heater.values) {
      expect(currentMa(P_mW, R_ohm)).toBeCloseTo(I_mA, 12);
      expect(powerMw(I_mA, R_ohm)).toBeCloseTo(P_mW, 12);
      const one = inventChip({ cells: [{ name: 'cell1', ringsPerArm: [0, 0] }], seed: 1, crosstalk: 0 });
      const channels = one.channels.map((channel) => ({
        ...channel,
        phasePerMw: Math.PI / P_pi_mW,
        phaseAtZeroRad: 0,
      }));
      const phases = phasesFromPowers({ ...one, channels }, [P_mW, 0, 0]);
      expect(phases[0]! / Math.PI).toBeCloseTo(phi_over_pi, 12);
      expect(phases[1]).toBe(0);
    }
  });

  it('act on their neighbours by the crosstalk matrix, and its inverse gives the powers back [cross-check]', () => {
    const {
      crosstalk,
      phasePerMw,
      phaseAtZeroRad,
      phaseRad,
      powerMw: powers,
      inverse,
      condition1,
    } = reference.crosstalk;
    const model = inventChip({ cells: [{ name: 'cell1', ringsPerArm: [1, 0] }], seed: 1 });
    const channels = model.channels.map((channel, i) => ({
      ...channel,
      phasePerMw: phasePerMw[i]!,
      phaseAtZeroRad: phaseAtZeroRad[i]!,
    }));
    const phases = phasesFromPowers({ ...model, channels, crosstalk }, powers);
    phases.forEach((phase, i) => {
      expect(Math.abs(phase - phaseRad[i]!)).toBeLessThan(SOLVED);
    });
    const n = powers.length;
    const gain = Float64Array.from(crosstalk, (share, k) => share * phasePerMw[Math.floor(k / n)]!);
    const inverted = invert(gain, n)!;
    inverted.inverse.forEach((entry, k) => {
      expect(Math.abs(entry - inverse[k]!)).toBeLessThan(SOLVED);
    });
    expect(inverted.condition).toBeCloseTo(condition1, 9);
    const again = new Float64Array(n);
    multiplyInto(
      again,
      inverted.inverse,
      Float64Array.from(phaseRad, (phase, i) => phase - phaseAtZeroRad[i]!),
    );
    again.forEach((power, i) => {
      expect(Math.abs(power - powers[i]!)).toBeLessThan(SOLVED);
    });
  });

  it('are not told apart by a singular matrix [cross-check]', () => {
    // Source: two equal rows, determinant 0.
    expect(invert(Float64Array.from([1, 0.5, 1, 0.5]), 2)).toBeNull();
  });
});

describe('driver channel', () => {
  const channel = inventChip({ cells: [{ name: 'cell1', ringsPerArm: [0, 0] }], seed: 1 }).channels[0]!;

  it('is limited by the lower of its current and its power limit [cross-check]', () => {
    // Source: √(0.1 W / 400 Ω) = 15.811… mA by hand.
    const byPower = { ...channel, resistanceOhm: 400, powerLimitMw: 100, currentLimitMa: 20 };
    expect(channelLimit(byPower).kind).toBe('CHANNEL_POWER');
    expect(channelLimit(byPower).currentMa).toBeCloseTo(15.811388300841896, 12);
    expect(channelLimit({ ...byPower, currentLimitMa: 15 })).toEqual({
      kind: 'CHANNEL_CURRENT',
      currentMa: 15,
    });
  });

  it('takes the nearest whole step, and never one beyond its limit [cross-check]', () => {
    const coarse = {
      ...channel,
      resistanceOhm: 500,
      powerLimitMw: 1000,
      currentLimitMa: 1,
      resolutionMa: 0.3,
    };
    expect(roundToStep(0.44, coarse)).toBeCloseTo(0.3, 12);
    expect(roundToStep(0.46, coarse)).toBeCloseTo(0.6, 12);
    expect(roundToStep(1, coarse)).toBeCloseTo(0.9, 12);
    expect(roundToStep(20, { ...channel, resistanceOhm: 10, resolutionMa: 0.0005 })).toBeCloseTo(20, 9);
  });
});
