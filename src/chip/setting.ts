/** What is sent to the driver, and what it makes of the chip. */
export type ChannelState = 'ACTIVE' | 'PARKED' | 'UNUSED';

export interface ChannelSetting {
  readonly channel: string;
  readonly drives: string;
  readonly state: ChannelState;
  /** A whole number of driver steps. */
  readonly currentMa: number;
  readonly powerMw: number;
  /** Phase of the driven element through crosstalk and rounding, rad, not wrapped. */
  readonly phaseRad: number;
  /** Whole turns above the least non-negative phase. */
  readonly wraps: number;
  /** The current this channel may not exceed: the lower of its current limit and √(power limit / resistance). */
  readonly limitMa: number;
}

export interface Parked {
  readonly element: string;
  readonly how: string;
}

export interface Caution {
  readonly code: string;
  readonly text: string;
  readonly channel?: string;
}

export interface Setting {
  /** Every driver channel of the chip, in the chip's order. */
  readonly channels: readonly ChannelSetting[];
  readonly totalPowerMw: number;
  readonly parked: readonly Parked[];
  readonly cautions: readonly Caution[];
  /** Temperature at which the calibration behind it holds, °C; absent where the chip's record does not say. */
  readonly temperatureC?: number;
}
