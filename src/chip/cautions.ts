/** What a person should know before a setting goes to the driver. */
import type { ChipModel } from './model.ts';
import { offBalanceCautions } from './off-balance.ts';
import type { PlacedCircuit } from './placed.ts';
import type { Caution, ChannelSetting } from './setting.ts';

/** Share of a channel's limit from which it is pointed out. Common practice, no source. */
const NEAR_LIMIT = 0.95;

/** Share of the chip's total limit, and heat where no limit is on record, that count as high. Common practice, no source. */
const NEAR_TOTAL = 0.8;
const HIGH_HEAT_MW = 1000;

/** A null that rounding keeps above this is pointed out: a 60 dB rejection wants 10 dB of room. Common practice, no source. */
const POOR_NULL_DB = -70;

const LASER: Caution = {
  code: 'LASER_RADIATION',
  text:
    'Infrared laser light is invisible and can injure eyes; a change of currents can move it to another output. ' +
    "Switch the laser off or block it before fibres are handled. The lab's laser safety officer, the local rules and " +
    'the data sheets of chip and driver take precedence over this setting.',
};

/** Cautions that every setting carries: always shown, and nothing a person could decide by a release. */
export const STANDING_CAUTIONS: readonly string[] = [LASER.code];

/**
 * Depth to which field errors of the phases, rad, fill a null of a balanced interferometer, dB: a phase error δ of an arm
 * or a coupler puts δ/2 of the field into the null; independent errors add as squares.
 */
function nullDepthDb(phaseErrorsRad: readonly number[]): number {
  const field = Math.hypot(...phaseErrorsRad) / 2;
  return 20 * Math.log10(field);
}

function heat(chip: ChipModel, totalPowerMw: number): Caution[] {
  const limit = chip.totalPowerLimitMw;
  const high = limit === undefined ? totalPowerMw > HIGH_HEAT_MW : totalPowerMw > NEAR_TOTAL * limit;
  if (!high) return [];
  const allowed = limit === undefined ? 'no total limit is on record' : `the limit is ${limit} mW`;
  const text =
    `The heaters take ${totalPowerMw.toFixed(1)} mW in all; ${allowed}. Chip and carrier get hot: cool and watch them as ` +
    "the chip's data sheet says.";
  return [{ code: 'HIGH_TOTAL_POWER', text }];
}

function nearLimits(channels: readonly ChannelSetting[]): Caution[] {
  return channels
    .filter((channel) => channel.currentMa > NEAR_LIMIT * channel.limitMa)
    .map((channel) => ({
      code: 'NEAR_CURRENT_LIMIT',
      channel: channel.channel,
      text:
        `Channel ${channel.channel} takes ${channel.currentMa.toFixed(4)} mA of at most ${channel.limitMa.toFixed(4)} mA; ` +
        'little is left for tuning. Do not raise the limit beyond what the data sheet of the chip allows.',
    }));
}

export interface CautionInput {
  readonly chip: ChipModel;
  readonly placed: PlacedCircuit;
  readonly channels: readonly ChannelSetting[];
  readonly totalPowerMw: number;
  /** What rounding to driver steps leaves between wanted and set phases, rad. */
  readonly phaseErrorsRad: readonly number[];
  readonly undriven: readonly string[];
  /** Rings that light reaches and that are not decoupled. */
  readonly coupledRings: readonly string[];
}

export function cautionsOf(input: CautionInput): Caution[] {
  const depthDb = nullDepthDb(input.phaseErrorsRad);
  const coupled = input.placed.cells.flatMap((cell) =>
    cell.rings
      .filter((ring) => ring.parked && input.coupledRings.includes(ring.element))
      .map((ring) => ring.element),
  );
  return [
    LASER,
    ...heat(input.chip, input.totalPowerMw),
    ...nearLimits(input.channels),
    ...offBalanceCautions(input.placed, input.chip),
    ...(depthDb > POOR_NULL_DB
      ? [
          {
            code: 'ROUNDING_LIMITS_NULL',
            text: `Driver steps leave phase errors that keep nulls at about ${depthDb.toFixed(0)} dB; finer steps would deepen them.`,
          },
        ]
      : []),
    ...(coupled.length > 0
      ? [
          {
            code: 'PARKED_RING_COUPLED',
            text: `These unused rings cannot be decoupled and are parked as the setting says: ${coupled.join(', ')}.`,
          },
        ]
      : []),
    ...input.undriven.map((path) => ({
      code: 'UNDRIVEN_ELEMENT',
      text: `${path} has no heater; the setting relies on it to rest where the model says.`,
    })),
  ];
}
