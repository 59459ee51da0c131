/** Driver channels: current and power of a heater (P = I²R), driver steps, limits. */
import type { DriverChannel } from './model.ts';

/** Room for the rounding of decimal steps: 0.0005 × 40000 counts as 20. */
const STEP_SLACK = 1e-6;

/** Digits that a product of a step count and a decimal step keeps; the 16th is dust (8.902000000000001). */
const CLEAN_DIGITS = 15;

/** Heat of a current: mA and Ω to mW. */
export function powerMw(currentMa: number, resistanceOhm: number): number {
  return currentMa * currentMa * resistanceOhm * 1e-3;
}

/** Current of a heat ≥ 0: mW and Ω to mA. */
export function currentMa(heatMw: number, resistanceOhm: number): number {
  return Math.sqrt((heatMw * 1e3) / resistanceOhm);
}

/** The current a channel may not exceed, and which of its two limits says so. */
export function channelLimit(channel: DriverChannel): {
  readonly currentMa: number;
  readonly kind: 'CHANNEL_CURRENT' | 'CHANNEL_POWER';
} {
  const byPower = currentMa(channel.powerLimitMw, channel.resistanceOhm);
  return byPower < channel.currentLimitMa
    ? { currentMa: byPower, kind: 'CHANNEL_POWER' }
    : { currentMa: channel.currentLimitMa, kind: 'CHANNEL_CURRENT' };
}

/** The nearest whole number of driver steps that stays within the channel's limit, mA. */
export function roundToStep(wantedMa: number, channel: DriverChannel): number {
  const most = Math.floor(channelLimit(channel).currentMa / channel.resolutionMa + STEP_SLACK);
  const steps = Math.min(most, Math.max(0, Math.round(wantedMa / channel.resolutionMa)));
  return Number((steps * channel.resolutionMa).toPrecision(CLEAN_DIGITS));
}
