import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { Curve } from '../../../server/operations/index.ts';
import {
  responseCsv,
  type SettingSheet,
  settingSheetCsv,
  settingSheetJson,
  touchstone,
} from '../../../server/views/index.ts';
import { sheetNumber } from '../../../server/views/setting-sheet.ts';

/** One row of the sheet that the service's contract shows, and a channel that is not used. */
const SHEET: SettingSheet = {
  chip: 'B7-04',
  chipRevision: 3,
  configuration: 'il50',
  version: 7,
  release: 'current',
  sequence: 12,
  setting: {
    channels: [
      {
        channel: '03',
        drives: 'cell1.ring2.phase',
        state: 'ACTIVE',
        currentMa: 4.125,
        powerMw: 13.6125,
        phaseRad: 1.2043,
        wraps: 0,
        limitMa: 12,
      },
      {
        channel: '04',
        drives: 'cell1.arm.phase',
        state: 'UNUSED',
        currentMa: -0,
        powerMw: 0,
        phaseRad: -1e-9,
        wraps: 0,
        limitMa: 12,
      },
    ],
    totalPowerMw: 13.6125,
    parked: [],
    cautions: [],
    temperatureC: 25,
  },
};

/** RFC 4180 section 2 for fields that are not quoted. */
function readCsv(text: string): string[][] {
  expect(text.endsWith('\r\n')).toBe(true);
  expect(text).not.toMatch(/"|[^\r]\n|\r[^\n]/);
  return text
    .slice(0, -2)
    .split('\r\n')
    .map((line) => line.split(','));
}

describe('a setting sheet', () => {
  it('[property] reads as the contract shows it', () => {
    expect(settingSheetCsv(SHEET)).toBe(
      'sheet,chip,chipRevision,configuration,version,release,sequence,channelCount,channel,drives,state,currentMa,powerMw,phaseRad,limitMa,temperatureC\r\n' +
        '1,B7-04,3,il50,7,current,12,2,03,cell1.ring2.phase,ACTIVE,4.125,13.6125,1.2043,12,25\r\n' +
        '1,B7-04,3,il50,7,current,12,2,04,cell1.arm.phase,UNUSED,0,0,0,12,25\r\n',
    );
  });

  it('[property] says the same as JSON', () => {
    const [names, ...rows] = readCsv(settingSheetCsv(SHEET));
    const json = settingSheetJson(SHEET);
    expect(json.channels.length).toBe(json.channelCount);
    rows.forEach((row, i) => {
      const told: Record<string, unknown> = { ...json, ...json.channels[i] };
      expect(names?.map((name) => String(told[name]))).toEqual(row);
    });
  });

  it('[property] leaves the names of what is not released empty', () => {
    const sheet = { ...SHEET, configuration: null, version: null, release: null, sequence: null };
    expect(settingSheetCsv(sheet)).toContain('\r\n1,B7-04,3,,,,,2,03,');
  });

  it('[property] prints no current above its limit, and refuses a setting that has one', () => {
    const [channel] = SHEET.setting.channels;
    const withChannel = (currentMa: number, limitMa: number) => ({
      ...SHEET,
      setting: { ...SHEET.setting, channels: [{ ...channel!, currentMa, limitMa }] },
    });
    const [, row] = readCsv(settingSheetCsv(withChannel(17.8885438, 17.8885438)));
    expect(row?.slice(-5, -1)).toEqual(['17.888543', '13.6125', '1.2043', '17.888543']);
    expect(() => settingSheetCsv(withChannel(17.9, 17.8))).toThrow(RangeError);
    expect(() => settingSheetCsv(withChannel(-1, 17.8))).toThrow(RangeError);
  });

  it('[property] writes plain decimals within half of the last place', () => {
    fc.assert(
      fc.property(fc.double({ min: -1e6, max: 1e6, noNaN: true }), (value) => {
        const text = sheetNumber(value);
        expect(text).toMatch(/^-?(0|[1-9]\d*)(\.\d{0,5}[1-9])?$/);
        expect(text).not.toBe('-0');
        expect(Math.abs(Number(text) - value)).toBeLessThanOrEqual(0.5000001e-6);
      }),
    );
    for (const value of [Number.NaN, Number.POSITIVE_INFINITY, 1e21]) {
      expect(() => sheetNumber(value)).toThrow(RangeError);
    }
  });
});

const CURVE: Curve = {
  stage: 'SETTING',
  output: 'OUT2',
  frequencyThz: [193.1, 193.1, 193.10625],
  wavelengthNm: [1552.52, 1552.52, 1552.47],
  offsetGhz: [0, 0, 6.25],
  field: { re: [0.5, 0.5, -1e-7], im: [-0.25, -0.25, 0] },
  transmissionDb: [-5.05, -5.05, -140],
  floorDb: -200,
  phaseRad: [-0.46, -0.46, 3.14],
  groupDelayPs: [12.5, 12.5, null],
  dispersionPsPerNm: [-3, -3, null],
  gaps: [{ from: 2, to: 2, reason: 'invented' }],
  reduced: false,
};

describe('a curve as a file', () => {
  // Touchstone specification, version 1.1 (IBIS Open Forum, 2002): comments after "!", one option line, columns
  // f S11 S21 S12 S22 as real and imaginary parts, frequencies in increasing order; from memory.
  it('[published] is a Touchstone two-port', () => {
    const origin = { design: { id: 'ab'.repeat(32) }, chip: { serial: 'X1' }, revision: { number: 2 } };
    const text = touchstone(CURVE, origin);
    // biome-ignore lint/suspicious/noControlCharactersInRegex: US-ASCII is what the standard asks for
    expect(text).toMatch(/^[\x00-\x7f]*$/);
    const lines = text.trimEnd().split('\n');
    const data = lines.filter((line) => !line.startsWith('!'));
    expect(data[0]).toBe('# GHz S RI R 50');
    expect(data.slice(1)).toEqual([
      '193100 0 0 0.5 -0.25 0.5 -0.25 0 0',
      '193106.25 0 0 -1e-7 0 -1e-7 0 0 0',
    ]);
    expect(text).toContain(`dsn_${'ab'.repeat(32)}`);
    expect(text).toContain('Chip X1, model revision 2');
  });

  it('[published] is a CSV table of RFC 4180, empty where nothing is defined', () => {
    const [names, ...rows] = readCsv(responseCsv(CURVE));
    expect(names?.join()).toBe(
      'frequencyThz,wavelengthNm,offsetGhz,fieldRe,fieldIm,transmissionDb,phaseRad,groupDelayPs,dispersionPsPerNm',
    );
    expect(rows.every((row) => row.length === names?.length)).toBe(true);
    expect(rows[2]?.slice(-2)).toEqual(['', '']);
  });
});
