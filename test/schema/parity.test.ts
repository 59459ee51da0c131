/** The GraphQL schema is written by hand, the zod rules too: only a test keeps them equal. */
import { readdirSync, readFileSync } from 'node:fs';
import {
  buildSchema,
  type GraphQLEnumType,
  type GraphQLInputObjectType,
  isEnumType,
  isInputObjectType,
  isInterfaceType,
  isIntrospectionType,
  isNonNullType,
  isObjectType,
  isSpecifiedScalarType,
} from 'graphql';
import { describe, expect, it } from 'vitest';
import { z } from 'zod';
import { chipModelRule } from '../../schema/chip.ts';
import {
  cellRule,
  couplerRule,
  delayRule,
  driverChannelRule,
  fsrRule,
  interferometerCellRule,
  lossesRule,
} from '../../schema/chip-parts.ts';
import {
  cancelDesignRequestRule,
  designRequestFilterRule,
  REQUEST_STATES,
  requestDesignRule,
} from '../../schema/design-request.ts';
import {
  ACTOR_KINDS,
  createTokenRule,
  publishReleaseRule,
  ROLES,
  registerChipRule,
  reviseChipRule,
  revokeTokenRule,
  saveVersionRule,
} from '../../schema/library.ts';
import { DESIGN_ORDERS, designFilterRule, historyFilterRule } from '../../schema/page.ts';
import { PROBLEM_CODES, PROBLEM_LIMITS } from '../../schema/problem.ts';
import { STAGES } from '../../schema/response.ts';
import {
  ARCHITECTURES,
  bandRule,
  FAMILIES,
  familySpecificationRule,
  filterSpecificationRule,
  maskSpecificationRule,
  REFERENCES,
  SHAPES,
  synthesisRule,
} from '../../schema/specification.ts';
import { frequencyRule, gridRule, intervalRule } from '../../schema/units.ts';
import { PROBLEM_TABLE } from '../../server/problem-table.ts';

const FOLDER = new URL('../../schema/', import.meta.url);
const SDL = readdirSync(FOLDER)
  .filter((name) => name.endsWith('.graphql') && name !== 'published.graphql')
  .map((name) => readFileSync(new URL(name, FOLDER), 'utf8'))
  .join('\n');
const schema = buildSchema(SDL);

/** One of the ranges and spans stands for its unit's three siblings. */
const branchOf = (rule: z.ZodType): z.ZodType => {
  const shape = (rule as unknown as z.ZodObject).shape as Record<string, z.ZodOptional>;
  return shape.offsetGhz!.unwrap() as z.ZodType;
};

const RULES: Readonly<Record<string, z.ZodType>> = {
  FrequencyInput: frequencyRule,
  IntervalInput: intervalRule,
  RangeInput: branchOf(intervalRule),
  GridInput: gridRule,
  SpanInput: branchOf(gridRule),
  FilterSpecificationInput: filterSpecificationRule,
  FamilySpecificationInput: familySpecificationRule,
  MaskSpecificationInput: maskSpecificationRule,
  BandInput: bandRule,
  SynthesisInput: synthesisRule,
  ChipModelInput: chipModelRule,
  FsrInput: fsrRule,
  DelayInput: delayRule,
  CellInput: cellRule,
  InterferometerCellInput: interferometerCellRule,
  CouplerInput: couplerRule,
  LossesInput: lossesRule,
  DriverChannelInput: driverChannelRule,
  RegisterChipInput: registerChipRule,
  ReviseChipInput: reviseChipRule,
  RequestDesignInput: requestDesignRule,
  CancelDesignRequestInput: cancelDesignRequestRule,
  SaveVersionInput: saveVersionRule,
  PublishReleaseInput: publishReleaseRule,
  CreateTokenInput: createTokenRule,
  RevokeTokenInput: revokeTokenRule,
  DesignFilter: designFilterRule,
  DesignRequestFilter: designRequestFilterRule,
  HistoryFilter: historyFilterRule,
};

const ENUMS: Readonly<Record<string, readonly string[]>> = {
  Family: FAMILIES,
  FilterShape: SHAPES,
  Architecture: ARCHITECTURES,
  TransmissionReference: REFERENCES,
  Limit: PROBLEM_LIMITS,
  RequestState: REQUEST_STATES,
  Stage: STAGES,
  Role: ROLES,
  ActorKind: ACTOR_KINDS,
  DesignOrder: DESIGN_ORDERS,
};

const types = Object.values(schema.getTypeMap()).filter(
  (type) => !isIntrospectionType(type) && !isSpecifiedScalarType(type),
);
const inputNames = types.filter(isInputObjectType).map((type) => type.name);

describe('schema and rules', () => {
  it('[property] have a rule for every input type and no other', () => {
    expect(Object.keys(RULES).sort()).toEqual(inputNames.sort());
  });

  it.each(inputNames)('[property] take the same members in %s', (name) => {
    const { shape } = RULES[name] as unknown as z.ZodObject;
    const fields = (schema.getType(name) as GraphQLInputObjectType).getFields();
    expect(Object.keys(shape).sort()).toEqual(Object.keys(fields).sort());
    for (const [member, rule] of Object.entries(shape)) {
      const isRequired = !(rule as z.ZodType).safeParse(undefined).success;
      expect([member, isRequired]).toEqual([member, isNonNullType(fields[member]!.type)]);
    }
  });

  it('[property] agree which inputs take one of their members', () => {
    const oneOf = types.filter(isInputObjectType).filter((type) => type.isOneOf);
    const names = oneOf.map((type) => type.name);
    const byRule = inputNames.filter((name) => z.globalRegistry.get(RULES[name]!)?.maxProperties === 1);
    expect(byRule.sort()).toEqual(names.sort());
  });

  it.each(Object.keys(ENUMS))('[property] have the same values in %s', (name) => {
    const values = (schema.getType(name) as GraphQLEnumType).getValues().map((value) => value.name);
    expect(values.sort()).toEqual([...ENUMS[name]!].sort());
  });

  it('[property] list the same problem codes in the schema, the rules and the table', () => {
    const said = schema.getType('Problem')?.description?.match(/\b[A-Z]+(_[A-Z]+)*\b/g) ?? [];
    const codes = said.filter(
      (word) => (PROBLEM_CODES as readonly string[]).includes(word) || /_/.test(word),
    );
    expect([...new Set(codes)].sort()).toEqual([...PROBLEM_CODES].sort());
    expect(Object.keys(PROBLEM_TABLE).sort()).toEqual([...PROBLEM_CODES].sort());
  });

  it('[property] describe every type, field, argument, member and value', () => {
    const silent: string[] = [];
    const note = (path: string, description: string | null | undefined) => {
      if (!description) silent.push(path);
    };
    for (const type of types) {
      note(type.name, type.description);
      if (isEnumType(type)) {
        for (const value of type.getValues()) note(`${type.name}.${value.name}`, value.description);
      }
      if (isInputObjectType(type)) {
        for (const field of Object.values(type.getFields()))
          note(`${type.name}.${field.name}`, field.description);
      }
      if (!isObjectType(type) && !isInterfaceType(type)) continue;
      for (const field of Object.values(type.getFields())) {
        note(`${type.name}.${field.name}`, field.description);
        for (const arg of field.args) note(`${type.name}.${field.name}(${arg.name})`, arg.description);
      }
    }
    expect(silent).toEqual([]);
  });

  it('[property] state who may ask for every root field', () => {
    const roots = [schema.getQueryType(), schema.getMutationType(), schema.getSubscriptionType()];
    const open = roots.flatMap((root) =>
      Object.values(root?.getFields() ?? {}).filter(
        (field) => !field.astNode?.directives?.some((directive) => directive.name.value === 'access'),
      ),
    );
    expect(open.map((field) => field.name)).toEqual([]);
  });

  it('[property] can all be told as JSON Schema', () => {
    for (const [name, rule] of Object.entries(RULES)) {
      expect([name, z.toJSONSchema(rule, { io: 'input' }).type]).toEqual([name, 'object']);
    }
  });
});
