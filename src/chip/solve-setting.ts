/** A placed circuit as heater currents: phases, powers through crosstalk with the least heat, currents in driver steps. */
import { Refusal } from '../errors.ts';
import { cautionsOf } from './cautions.ts';
import { channelLimit, currentMa, powerMw, roundToStep } from './currents.ts';
import { type Heating, heatingOf, type LeastHeat, leastHeat, offTurn } from './heat.ts';
import { phasesFromPowers } from './heaters.ts';
import type { ChipModel, DriverChannel } from './model.ts';
import type { PlacedCircuit } from './placed.ts';
import type { ChannelSetting, ChannelState, Setting } from './setting.ts';
import { thermalTargets, wantedPhase } from './targets.ts';

const TURN = 2 * Math.PI;

/** Digits enough to tell a need from a limit that it misses by a hair. */
const shown = (value: number): string => String(Number(value.toPrecision(8)));

/** The limit would allow the current; the last driver step below the limit is short of it. */
function refuseSteps(channel: DriverChannel, needMa: number, mostMa: number): never {
  throw new Refusal({
    code: 'SETTING_UNREACHABLE',
    limit: 'CHANNEL_CURRENT',
    detail:
      `Channel ${channel.channel} (${channel.drives}) would need ${shown(needMa)} mA; in steps of ` +
      `${channel.resolutionMa} mA its driver gives ${shown(mostMa)} mA at the most within its limit.`,
    channel: channel.channel,
    element: channel.drives,
    given: needMa,
    allowed: mostMa,
  });
}

/** Where not all limits can be met: refuses with the channel that would be furthest beyond its own. */
/** Heat that a channel should have for any phase to be within reach, in turns: one for the phase, the rest for crosstalk. */
const REACH_TURNS = 1.2;

/** Where the limit itself stands in the way of most settings, whatever is asked. */
function wholeTurn({ phasePerMw }: DriverChannel, limitMw: number): string {
  const turnMw = (2 * Math.PI) / phasePerMw;
  return limitMw >= REACH_TURNS * turnMw
    ? ''
    : ` A whole turn of its phase takes ${shown(turnMw)} mW: below ${REACH_TURNS} times that, some phases are always out of reach.`;
}

function checkLimits(heating: Heating, { solution, floorsKept }: LeastHeat, chip: ChipModel): void {
  if (solution.violationMw === 0) return;
  const { limitMw } = heating.problem;
  const beyond = Array.from(floorsKept.powersMw, (power, i) => power / limitMw[i]!);
  const worst = beyond.indexOf(Math.max(...beyond));
  const needMw = floorsKept.powersMw[worst]!;
  const channel = chip.channels[heating.demands[worst]!.channel]!;
  const limit = channelLimit(channel);
  const byPower = limit.kind === 'CHANNEL_POWER';
  const needMa = currentMa(needMw, channel.resistanceOhm);
  const inSteps = roundToStep(limit.currentMa, channel);
  if (needMa <= limit.currentMa) refuseSteps(channel, needMa, inSteps);
  throw new Refusal({
    code: 'SETTING_UNREACHABLE',
    limit: limit.kind,
    detail:
      `Channel ${channel.channel} (${channel.drives}) would need ${shown(needMa)} mA, ${shown(needMw)} mW; ` +
      `its ${byPower ? 'power' : 'current'} limit allows ${shown(limit.currentMa)} mA.${wholeTurn(channel, limitMw[worst]!)}`,
    channel: channel.channel,
    element: channel.drives,
    given: byPower ? needMw : needMa,
    allowed: byPower ? channel.powerLimitMw : channel.currentLimitMa,
  });
}

function checkTotal(chip: ChipModel, totalPowerMw: number): void {
  const limit = chip.totalPowerLimitMw;
  if (limit === undefined || totalPowerMw <= limit) return;
  throw new Refusal({
    code: 'SETTING_UNREACHABLE',
    limit: 'TOTAL_POWER',
    detail: `All heaters together would take ${totalPowerMw.toFixed(3)} mW; the chip allows ${limit} mW.`,
    given: totalPowerMw,
    allowed: limit,
  });
}

function stateOf(path: string, used: boolean, placed: PlacedCircuit): ChannelState {
  if (!used) return 'UNUSED';
  return placed.parked.some(({ element }) => path.startsWith(`${element}.`)) ? 'PARKED' : 'ACTIVE';
}

function channelSettings(
  chip: ChipModel,
  heatMw: Float64Array,
  used: ReadonlySet<number>,
  placed: PlacedCircuit,
): ChannelSetting[] {
  const currents = chip.channels.map((channel, i) =>
    roundToStep(currentMa(heatMw[i]!, channel.resistanceOhm), channel),
  );
  const powers = chip.channels.map((channel, i) => powerMw(currents[i]!, channel.resistanceOhm));
  const phases = phasesFromPowers(chip, powers);
  return chip.channels.map((channel, i) => ({
    channel: channel.channel,
    drives: channel.drives,
    state: stateOf(channel.drives, used.has(i), placed),
    currentMa: currents[i]!,
    powerMw: powers[i]!,
    phaseRad: phases[i]!,
    wraps: Math.floor(phases[i]! / TURN),
    limitMa: channelLimit(channel).currentMa,
  }));
}

/** Set less wanted phase of every demand that shapes the response; cells that only pass light on are left out. */
function roundingErrors(
  heating: Heating,
  branches: Uint8Array,
  channels: readonly ChannelSetting[],
  placed: PlacedCircuit,
): number[] {
  const passed = placed.parked.filter(({ element }) => !element.includes('.'));
  return heating.demands
    .filter(({ path }) => !passed.some(({ element }) => path.startsWith(`${element}.`)))
    .map((demand) => {
      const set = demand.terms.reduce(
        (sum, { channel, weight }) => sum + weight * channels[channel]!.phaseRad,
        0,
      );
      return offTurn(set - wantedPhase(demand, branches));
    });
}

/**
 * The setting that makes the chip the placed circuit with the least total heat found: coupler branches, whole turns,
 * crosstalk, driver steps; every channel of the chip in its order, heaters that nothing depends on at 0.
 *
 * The circuit's parameters are those of the lossless placed circuit; losses do not change phases. Throws a Refusal
 * SETTING_UNREACHABLE with limit CHANNEL_CURRENT, CHANNEL_POWER or TOTAL_POWER and the channel named, or with the element
 * that no channel drives.
 */
export function solveSetting(placed: PlacedCircuit, chip: ChipModel): Setting {
  const targets = thermalTargets(placed, chip);
  const heating = heatingOf(targets, chip);
  const least = leastHeat(heating, targets, chip);
  checkLimits(heating, least, chip);
  const { branches, solution } = least;
  const heatMw = new Float64Array(chip.channels.length);
  heating.demands.forEach((demand, i) => {
    // A floor of 0 may be missed by rounding; limits and floors themselves have been checked.
    heatMw[demand.channel] = Math.max(0, solution.powersMw[i]!);
  });
  const used = new Set(heating.demands.map((demand) => demand.channel));
  const channels = channelSettings(chip, heatMw, used, placed);
  const totalPowerMw = channels.reduce((sum, channel) => sum + channel.powerMw, 0);
  checkTotal(chip, totalPowerMw);
  const phaseErrorsRad = roundingErrors(heating, branches, channels, placed);
  const { undriven, coupledRings } = targets;
  const cautions = cautionsOf({
    chip,
    placed,
    channels,
    totalPowerMw,
    phaseErrorsRad,
    undriven,
    coupledRings,
  });
  const { temperatureC } = chip;
  return {
    channels,
    totalPowerMw,
    parked: placed.parked,
    cautions,
    ...(temperatureC === undefined ? {} : { temperatureC }),
  };
}
