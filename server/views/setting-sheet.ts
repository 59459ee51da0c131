/**
 * The setting sheet: what an instrument PC sets. One row for every driver channel of the chip, unused ones at 0,
 * because a channel that is not listed would keep its last current. Readers refuse a sheet whose rows are not
 * `channelCount`. Currents keep the limits on record; local rules and the chip's data sheet have the last word.
 *
 * CSV after RFC 4180: CRLF after every line, no byte order mark, nothing quoted (names are such that nothing needs it).
 */
import type { Setting } from '../../src/chip/index.ts';
import type {
  ChipRecord,
  ChipRevisionRecord,
  DesignRecord,
  ReleaseRecord,
  VersionRecord,
} from '../store/records.ts';

/** Layout of the columns and members; new ones come at the right, anything else raises it. */
const SHEET_LAYOUT = 1;

export interface SettingSheet {
  readonly chip: string;
  readonly chipRevision: number;
  /** null in the sheet of a design that is no version yet. */
  readonly configuration: string | null;
  readonly version: number | null;
  /** null in the sheet of an unreleased version. */
  readonly release: string | null;
  readonly sequence: number | null;
  readonly setting: Setting;
}

const HEADER =
  'sheet,chip,chipRevision,configuration,version,release,sequence,channelCount,channel,drives,state,currentMa,powerMw,phaseRad,limitMa,temperatureC';

/** Decimal places of every number: 1 nA, 1 nW, 1 µrad. */
const PLACES = 6;
const PER_UNIT = 10 ** PLACES;

/**
 * Plain decimal with a point, at most six places, no exponent, no "-0", no trailing zeros.
 * @throws RangeError for what no heater current, power or phase can be
 */
export function sheetNumber(value: number): string {
  // Beyond 1e9 the places asked for are not in a double any more.
  if (!(Math.abs(value) < 1e9)) throw new RangeError(`${value} does not belong into a setting sheet`);
  const text = value.toFixed(PLACES).replace(/\.?0+$/, '');
  return text === '-0' ? '0' : text;
}

/** A limit is rounded down: what is printed is never above what is allowed. */
function sheetLimit(limit: number): number {
  return Number(sheetNumber(Math.floor(limit * PER_UNIT + 1e-6) / PER_UNIT));
}

interface SheetRow {
  readonly channel: string;
  readonly drives: string;
  readonly state: string;
  readonly currentMa: number;
  readonly powerMw: number;
  readonly phaseRad: number;
  readonly limitMa: number;
}

/** Rounded numbers, the same in both forms. A current that rounding would lift above its limit is cut instead. */
function rowsOf(setting: Setting): SheetRow[] {
  return setting.channels.map(({ channel, drives, state, currentMa, powerMw, phaseRad, limitMa }) => {
    const limit = sheetLimit(limitMa);
    if (currentMa > limitMa || currentMa < 0) {
      throw new RangeError(`channel ${channel}: ${currentMa} mA is outside of 0 to ${limitMa} mA`);
    }
    return {
      channel,
      drives,
      state,
      currentMa: Math.min(Number(sheetNumber(currentMa)), limit),
      powerMw: Number(sheetNumber(powerMw)),
      phaseRad: Number(sheetNumber(phaseRad)),
      limitMa: limit,
    };
  });
}

export function settingSheetCsv(sheet: SettingSheet): string {
  const { setting, chip, chipRevision, configuration, version, release, sequence } = sheet;
  const rows = rowsOf(setting);
  const head = [SHEET_LAYOUT, chip, chipRevision, configuration, version, release, sequence, rows.length];
  const before = head.map((value) => value ?? '').join(',');
  // The layout's last column so far: an empty field where the chip's record has no temperature.
  const temperature = setting.temperatureC === undefined ? '' : sheetNumber(setting.temperatureC);
  const lines = rows.map((row) => {
    const numbers = [row.currentMa, row.powerMw, row.phaseRad, row.limitMa].map(sheetNumber);
    return [before, row.channel, row.drives, row.state, ...numbers, temperature].join(',');
  });
  return `${[HEADER, ...lines].join('\r\n')}\r\n`;
}

export function settingSheetJson(sheet: SettingSheet) {
  const { setting, ...names } = sheet;
  const channels = rowsOf(setting);
  const temperatureC = setting.temperatureC ?? null;
  return { sheet: SHEET_LAYOUT, ...names, channelCount: channels.length, channels, temperatureC };
}

export function designSheet(
  design: DesignRecord,
  chip: Pick<ChipRecord, 'serial'>,
  revision: Pick<ChipRevisionRecord, 'number'>,
): SettingSheet {
  return {
    chip: chip.serial,
    chipRevision: revision.number,
    configuration: null,
    version: null,
    release: null,
    sequence: null,
    setting: design.result.setting,
  };
}

export function versionSheet(version: VersionRecord, chip: Pick<ChipRecord, 'serial'>): SettingSheet {
  return {
    chip: chip.serial,
    chipRevision: version.chipRevisionNumber,
    configuration: version.configurationName,
    version: version.number,
    release: null,
    sequence: null,
    setting: version.setting,
  };
}

export function releaseSheet(release: ReleaseRecord): SettingSheet {
  return {
    ...versionSheet(release.version, { serial: release.chipSerial }),
    release: release.name,
    sequence: release.sequence,
  };
}
