/** What answers hold, for the OpenAPI document; tests hold real answers against these rules. */
import { z } from 'zod';
import { REQUEST_STATES } from '../../schema/design-request.ts';
import {
  ACTOR_KINDS,
  publishReleaseRule,
  ROLES,
  registerChipRule,
  reviseChipRule,
  saveVersionRule,
} from '../../schema/library.ts';
import { STAGES } from '../../schema/response.ts';
import { ARCHITECTURES, FAMILIES, OUTPUTS, REFERENCES, SHAPES } from '../../schema/specification.ts';
import { documentedRules, problemAnswer } from './describe.ts';

const named = <T extends z.ZodType>(id: string, rule: T): T => {
  documentedRules.add(rule, { id });
  return rule;
};

const time = z.iso.datetime().describe('UTC, milliseconds.');
const hash = z.string().describe('SHA-256, hex.');
const numbers = z.array(z.number());

const actor = named('Actor', z.strictObject({ id: z.string(), kind: z.enum(ACTOR_KINDS), name: z.string() }));
const actorOrNone = actor.nullable();

const opticalFrequency = named(
  'OpticalFrequency',
  z.strictObject({
    frequencyThz: z.number(),
    wavelengthNm: z.number().describe('In vacuum.'),
    offsetGhz: z.number().describe('From the reference frequency of the chip.'),
    offsetFsr: z.number(),
  }),
);
const complex = z.strictObject({ re: z.number(), im: z.number() });
const complexList = z.strictObject({ re: numbers, im: numbers });
const interval = z.strictObject({ low: opticalFrequency, high: opticalFrequency });

const band = named(
  'Band',
  z.strictObject({
    index: z.int(),
    label: z.string().nullable(),
    interval,
    minTransmissionDb: z.number().nullable(),
    maxTransmissionDb: z.number().nullable(),
    output: z.enum(OUTPUTS),
  }),
);

const specification = named(
  'FilterSpecification',
  z.union([
    z.strictObject({
      family: z.enum(FAMILIES),
      shape: z.enum(SHAPES),
      order: z.int().nullable(),
      centre: opticalFrequency,
      band: interval.nullable(),
      stopband: interval.nullable(),
      rippleDb: z.number().nullable(),
      rejectionDb: z.number().nullable(),
      gridGhz: z.number().nullable(),
      output: z.enum(OUTPUTS),
    }),
    z.strictObject({
      bands: z.array(band),
      family: z.enum(FAMILIES).nullable(),
      order: z.int().nullable(),
      reference: z.enum(REFERENCES),
    }),
  ]),
);

export const meAnswer = z.strictObject({ actor, role: z.enum(ROLES), tokenExpiresAt: time.nullable() });

export const serviceAnswer = z.strictObject({
  version: z.string(),
  engineVersion: z.string(),
  limits: z.record(z.string(), z.number()),
});

export const revisionAnswer = named(
  'ChipRevision',
  z.strictObject({
    id: z.string(),
    number: z.int(),
    hash,
    note: z.string(),
    createdAt: time,
    createdBy: actorOrNone,
    model: z
      .looseObject({ referenceFrequencyThz: z.number(), fsrGhz: z.number(), input: z.looseObject({}) })
      .describe('The model with every default filled in; `input` is what to send, changed, to revise it.'),
  }),
);

export const chipAnswer = named(
  'Chip',
  z.strictObject({
    id: z.string(),
    serial: z.string(),
    description: z.string(),
    retiredAt: time.nullable(),
    createdAt: time,
    createdBy: actorOrNone,
    head: revisionAnswer,
  }),
);

/** Registering takes a description, revising a note; the serial stands in the path. */
export const putChipRule = z.union([
  registerChipRule.omit({ serial: true }),
  reviseChipRule.omit({ chip: true, expectedRevision: true }),
]);
export const saveVersionBody = saveVersionRule.omit({
  chip: true,
  configuration: true,
  expectedVersion: true,
});
export const publishBody = publishReleaseRule.omit({ chip: true, name: true, expectedSequence: true });

export const requestAnswer = named(
  'DesignRequest',
  z.strictObject({
    id: z.string(),
    state: z.enum(REQUEST_STATES),
    progress: z.number().min(0).max(1),
    cached: z.boolean().describe('Answered from the store; nothing was written.'),
    asked: z.looseObject({}).describe('The body as it was sent.'),
    problem: problemAnswer.nullable(),
    createdAt: time,
    createdBy: actorOrNone,
    finishedAt: time.nullable(),
    chip: z.string().nullable().describe('Serial.'),
    chipRevision: z.int(),
    design: z.string().nullable().describe('Id, exactly when DONE.'),
  }),
);

export const checkAnswer = z.strictObject({
  ok: z.boolean(),
  order: z.int().nullable(),
  rings: z.int().nullable(),
  problem: problemAnswer.nullable(),
  specification: specification.nullable(),
  chipRevision: z.int().nullable(),
  designHash: hash.nullable(),
  cached: z.boolean().describe('The answer to this question is in the store.'),
});

const channelSetting = z.strictObject({
  channel: z.string(),
  drives: z.string(),
  state: z.enum(['ACTIVE', 'PARKED', 'UNUSED']),
  currentMa: z.number(),
  powerMw: z.number(),
  phaseRad: z.number(),
  wraps: z.int(),
  limitMa: z.number(),
});

const setting = named(
  'Setting',
  z.strictObject({
    channels: z.array(channelSetting),
    totalPowerMw: z.number(),
    parked: z.array(z.strictObject({ element: z.string(), how: z.string() })),
    cautions: z.array(z.strictObject({ code: z.string(), text: z.string(), channel: z.string().nullable() })),
    temperatureC: z.number().nullable().describe('At which the calibration holds; null where not on record.'),
  }),
);

const compliance = named(
  'Compliance',
  z.strictObject({
    met: z.boolean(),
    reference: z
      .enum(['INPUT', 'PEAK'])
      .describe('What the dB of demands count from; PEAK for the family form.'),
    worstMarginDb: z.number().nullable(),
    bands: z.array(
      z.strictObject({
        band,
        quantity: z.enum(['MIN_TRANSMISSION_DB', 'MAX_TRANSMISSION_DB']),
        demand: z.number(),
        reached: z.number(),
        margin: z.number().describe('dB inside (+) or outside (-) of the demand.'),
        met: z.boolean(),
        worstAt: opticalFrequency,
      }),
    ),
  }),
);

const figure = z.number().nullable();
const figures = named(
  'Figures',
  z.strictObject({
    insertionLossDb: figure,
    rippleDb: figure,
    rejectionDb: figure,
    extinctionRatioDb: figure,
    bandwidth1DbGhz: figure,
    bandwidth3DbGhz: figure,
    bandwidth20DbGhz: figure,
    shapeFactor: figure,
    groupDelayRipplePs: figure,
    worstNeighbourIsolationDb: figure,
    notDefined: z.array(z.strictObject({ figure: z.string(), reason: z.string() })),
  }),
);

const alternative = z.strictObject({
  family: z.enum(FAMILIES).nullable(),
  architecture: z.enum(ARCHITECTURES),
  order: z.int(),
  rings: z.int(),
  fits: z.boolean(),
  worstMarginDb: figure,
  insertionLossDb: figure,
  reason: z.string(),
});

const circuitCell = z.strictObject({
  cell: z.string(),
  section: z.int().nullable(),
  inputCoupling: z.number(),
  outputCoupling: z.number(),
  armPhaseRad: z.number(),
  rings: z.array(
    z.strictObject({
      element: z.string(),
      arm: z.int(),
      powerCrossCoupling: z.number(),
      phaseRad: z.number(),
      parked: z.boolean(),
    }),
  ),
});

const factors = { zeros: complexList, poles: complexList, gain: complex };

export const designAnswer = named(
  'Design',
  z.strictObject({
    id: z.string(),
    hash,
    canonical: z.string(),
    engineVersion: z.string(),
    order: z.int(),
    family: z.enum(FAMILIES).nullable(),
    architecture: z.enum(ARCHITECTURES),
    reason: z.string(),
    alternatives: z.array(alternative),
    tradeOff: z.array(z.strictObject({ stopEdgeGhz: z.number(), insertionLossDb: z.number().nullable() })),
    createdAt: time,
    chip: z.string().nullable().describe('Serial.'),
    chipRevision: z.int(),
    specification,
    output: z.enum(OUTPUTS).describe('The output that carries the filter.'),
    transferFunction: z.strictObject({
      ...factors,
      sections: z.array(z.strictObject({ ...factors, peakDb: z.number() })),
    }),
    circuit: z.strictObject({ architecture: z.enum(ARCHITECTURES), cells: z.array(circuitCell) }),
    setting,
    compliance,
    figures,
  }),
);

const undefinedSomewhere = z.array(z.number().nullable()).describe('null where undefined; `gaps` says why.');

export const curveAnswer = z.strictObject({
  stage: z.enum(STAGES),
  output: z.enum(OUTPUTS),
  frequencyThz: numbers,
  wavelengthNm: numbers,
  offsetGhz: numbers,
  field: complexList,
  transmissionDb: numbers.describe('Never below `floorDb`.'),
  floorDb: z.number(),
  phaseRad: numbers,
  groupDelayPs: undefinedSomewhere,
  dispersionPsPerNm: undefinedSomewhere,
  gaps: z.array(z.strictObject({ from: z.int(), to: z.int(), reason: z.string() })),
  reduced: z.boolean(),
});

export const netlistAnswer = z.strictObject({
  elements: z.array(z.looseObject({ id: z.string(), kind: z.enum(['coupler', 'waveguide']) })),
  connections: z.array(z.array(z.string()).length(2)),
  ports: z.record(z.string(), z.string()),
});

export const sheetAnswer = named(
  'SettingSheet',
  z.strictObject({
    sheet: z.literal(1).describe('Layout version.'),
    chip: z.string(),
    chipRevision: z.int(),
    configuration: z.string().nullable(),
    version: z.int().nullable(),
    release: z.string().nullable(),
    sequence: z.int().nullable(),
    channelCount: z.int().describe('Rows; a reader refuses a sheet that is short.'),
    channels: z.array(channelSetting.omit({ wraps: true })),
    temperatureC: z.number().nullable().describe('At which the calibration holds; null where not on record.'),
  }),
);

export const versionAnswer = named(
  'ConfigurationVersion',
  z.strictObject({
    id: z.string(),
    configuration: z.string(),
    number: z.int(),
    chipRevision: z.int(),
    stale: z.boolean().describe('The chip has a newer revision.'),
    design: z.string(),
    setting,
    contentHash: hash,
    note: z.string(),
    createdAt: time,
    createdBy: actorOrNone,
  }),
);

export const configurationAnswer = named(
  'Configuration',
  z.strictObject({
    id: z.string(),
    name: z.string(),
    lastVersion: z.int(),
    latest: versionAnswer.nullable(),
    retiredAt: time.nullable(),
    createdAt: time,
    createdBy: actorOrNone,
  }),
);

export const releaseAnswer = named(
  'Release',
  z.strictObject({
    id: z.string(),
    chip: z.string(),
    name: z.string(),
    sequence: z.int(),
    current: z.boolean(),
    configuration: z.string(),
    version: z.int(),
    chipRevision: z.int(),
    stale: z.boolean(),
    design: z.string(),
    note: z.string(),
    accepted: z.array(z.string()),
    createdAt: time,
    createdBy: actorOrNone,
  }),
);

export const releasesAnswer = z.strictObject({ releases: z.array(releaseAnswer) });

export const historyAnswer = named(
  'HistoryEntry',
  z.strictObject({
    id: z.string(),
    at: time,
    actor,
    action: z.string(),
    subjectKind: z.string(),
    subjectLabel: z.string(),
    chip: z.string().nullable(),
    detail: z.looseObject({}),
  }),
);

const pageInfo = named(
  'PageInfo',
  z.strictObject({
    hasNextPage: z.boolean(),
    hasPreviousPage: z.boolean(),
    startCursor: z.string().nullable(),
    endCursor: z.string().nullable(),
  }),
);

export const connectionAnswer = <T extends z.ZodType>(node: T) =>
  z.strictObject({ edges: z.array(z.strictObject({ cursor: z.string(), node })), pageInfo });
