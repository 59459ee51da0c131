import {
  type GraphQLField,
  type GraphQLObjectType,
  getNamedType,
  isCompositeType,
  isObjectType,
  isRequiredArgument,
  isUnionType,
} from 'graphql';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { createSchema } from '../../../server/graphql/schema.ts';
import { readSdl } from '../../../server/graphql/sdl.ts';
import { ROLES } from '../rest/service.ts';
import { ask, openLine } from './ask.ts';
import { type Lab, openLab, SERIAL, SPECIFICATION } from './lab.ts';

type Role = (typeof ROLES)[number];

const PEOPLE: readonly Role[] = ['READER', 'DESIGNER', 'ADMIN'];
const MAKERS: readonly Role[] = ['DESIGNER', 'ADMIN'];

/** The contract's table of who may what, written down a second time; what is not here is open to every role. */
const RULES: Readonly<Record<string, readonly Role[]>> = {
  'Query.designs': PEOPLE,
  'Query.designRequest': PEOPLE,
  'Query.designRequests': PEOPLE,
  'Query.checkSpecification': PEOPLE,
  'Query.history': PEOPLE,
  'Query.tokens': ['ADMIN'],
  'Chip.history': PEOPLE,
  'Mutation.registerChip': MAKERS,
  'Mutation.reviseChip': MAKERS,
  'Mutation.requestDesign': MAKERS,
  'Mutation.cancelDesignRequest': MAKERS,
  'Mutation.saveVersion': MAKERS,
  'Mutation.publishRelease': MAKERS,
  'Mutation.createToken': ['ADMIN'],
  'Subscription.designRequestChanged': PEOPLE,
};

const schema = createSchema();
const objectTypes = Object.values(schema.getTypeMap()).filter(
  (type): type is GraphQLObjectType => isObjectType(type) && !type.name.startsWith('__'),
);

let lab: Lab;
beforeAll(async () => {
  lab = await openLab();
});
afterAll(() => lab?.service.stop());

/** Values for arguments that must be given, in GraphQL. */
function requiredValue(argument: string): string {
  const family =
    'family: CHEBYSHEV_I, shape: LOW_PASS, order: 3, rippleDb: 0.5, band: {offsetGhz: {low: -5, high: 5}}';
  const values: Record<string, string> = {
    serial: `"${SERIAL}"`,
    name: '"flat-top"',
    number: '1',
    id: `"${lab.designId}"`,
    input: `{chip: "${SERIAL}", specification: {family: {${family}}}}`,
  };
  return values[argument] ?? 'null';
}

function callOf(field: GraphQLField<unknown, unknown>, selection: string): string {
  const args = field.args.filter(isRequiredArgument).map(({ name }) => `${name}: ${requiredValue(name)}`);
  const list = args.length > 0 ? `(${args.join(', ')})` : '';
  return `${field.name}${list}${isCompositeType(getNamedType(field.type)) ? ` { ${selection} }` : ''}`;
}

interface Way {
  /** Wraps the selection on the type into a query. */
  readonly query: (selection: string) => string;
  readonly passes: readonly string[];
}

/** The shortest way from the roots of reading to every object type. */
function waysToTypes(): Map<string, Way> {
  const query = schema.getQueryType()!;
  const ways = new Map<string, Way>([['Query', { query: (selection) => `{ ${selection} }`, passes: [] }]]);
  const open: GraphQLObjectType[] = [query];
  for (let type = open.shift(); type; type = open.shift()) {
    const { query: outer, passes } = ways.get(type.name)!;
    for (const field of Object.values(type.getFields())) {
      const target = getNamedType(field.type);
      const members = isUnionType(target) ? target.getTypes() : isObjectType(target) ? [target] : [];
      for (const member of members) {
        if (ways.has(member.name)) continue;
        const fragment = (selection: string) =>
          isUnionType(target) ? `... on ${member.name} { ${selection} }` : selection;
        ways.set(member.name, {
          query: (selection) => outer(callOf(field, fragment(selection))),
          passes: [...passes, `${type.name}.${field.name}`],
        });
        open.push(member);
      }
    }
  }
  return ways;
}

describe('every field, asked for by every role', () => {
  const ways = waysToTypes();
  for (const type of objectTypes) {
    const way = ways.get(type.name);
    if (!way) continue;
    it(`${type.name} [property]`, async () => {
      for (const field of Object.values(type.getFields())) {
        const label = `${type.name}.${field.name}`;
        const query = way.query(`__typename ${callOf(field, '__typename')}`);
        const asked = ROLES.map(async (role) => {
          const { errors } = await ask(lab.service, query, { token: lab.service.tokens[role] });
          return [label, role, errors.map(({ extensions }) => extensions.code)];
        });
        const expected = ROLES.map((role) => {
          const mayAll = [...way.passes, label].every((step) => RULES[step]?.includes(role) ?? true);
          return [label, role, mayAll ? [] : ['FORBIDDEN']];
        });
        expect(await Promise.all(asked)).toEqual(expected);
      }
    });
  }

  it('reaches every type but those that answer mutations and subscriptions', () => {
    const unreached = objectTypes.map(({ name }) => name).filter((name) => !ways.has(name));
    expect(
      unreached.every((name) => /^(Mutation|Subscription|.*Payload|MaskSpecification|Token.*)$/.test(name)),
      unreached.join(),
    ).toBe(true);
  });
});

describe('every mutation and subscription, asked for by every role', () => {
  const MINIMAL: Readonly<Record<string, object>> = {
    registerChip: {
      serial: '-',
      model: {
        referenceFrequencyThz: 1,
        fsr: { fsrGhz: 1 },
        cells: [],
        losses: { unitDelayLossDb: 0, couplerExcessLossDb: 0 },
        channels: [],
      },
    },
    reviseChip: {
      chip: 'none',
      expectedRevision: 1,
      model: {
        referenceFrequencyThz: 1,
        fsr: { fsrGhz: 1 },
        cells: [],
        losses: { unitDelayLossDb: 0, couplerExcessLossDb: 0 },
        channels: [],
      },
    },
    requestDesign: { chip: 'none', specification: SPECIFICATION },
    cancelDesignRequest: { id: 'req_0' },
    saveVersion: { chip: 'none', configuration: 'x', design: 'dsn_0' },
    publishRelease: { chip: 'none', configuration: 'x', version: 1 },
    createToken: { actor: '-', role: 'READER', label: 'x' },
    revokeToken: { id: 'tok_0' },
  };

  for (const field of Object.values(schema.getMutationType()!.getFields())) {
    it(`Mutation.${field.name} [property]`, async () => {
      const input = field.args[0]!;
      const query = `mutation ($input: ${input.type}) { ${field.name}(input: $input) { __typename } }`;
      for (const role of ROLES) {
        const variables = { input: MINIMAL[field.name] };
        const { data, errors, status } = await ask(lab.service, query, {
          variables,
          token: lab.service.tokens[role],
        });
        const mayDo = RULES[`Mutation.${field.name}`]?.includes(role) ?? true;
        const code = errors[0]?.extensions.code;
        // One's own token is anybody's to revoke; of others one is told as little as of none.
        if (field.name === 'revokeToken') expect(code).toBe(role === 'ADMIN' ? 'NOT_FOUND' : 'FORBIDDEN');
        else expect([role, code === 'FORBIDDEN']).toEqual([role, !mayDo]);
        if (status === 200 && data) expect(data).toEqual({ [field.name]: null });
      }
    });
  }

  it('subscriptions [property]', async () => {
    const watches = {
      designRequestChanged: 'subscription { designRequestChanged(id: "req_0") { id } }',
      releasePublished: 'subscription { releasePublished(chip: "none") { id } }',
    };
    expect(Object.keys(watches)).toEqual(Object.keys(schema.getSubscriptionType()!.getFields()));
    for (const [name, query] of Object.entries(watches)) {
      for (const role of ROLES) {
        const line = openLine(lab.service.url, { token: lab.service.tokens[role] });
        const { value } = await line.follow(query).next();
        const mayDo = RULES[`Subscription.${name}`]?.includes(role) ?? true;
        expect([name, role, value.errors[0].extensions.code]).toEqual([
          name,
          role,
          mayDo ? 'NOT_FOUND' : 'FORBIDDEN',
        ]);
        await line.client.dispose();
      }
    }
  });
});

describe('what may not be seen', () => {
  it('is null behind its id, the same as what is not there', async () => {
    const { tokens, newToken } = lab.service;
    const { id } = await newToken('READER', undefined, 'invented other');
    const query = 'query ($t: ID!, $r: ID!) { token: node(id: $t) { id } request: node(id: $r) { id } }';
    const variables = { t: id, r: lab.requestId };
    const seen = async (role: Role) =>
      (await ask(lab.service, query, { variables, token: tokens[role] })).data;
    expect(await seen('INSTRUMENT')).toEqual({ token: null, request: null });
    expect(await seen('READER')).toEqual({ token: null, request: { id: lab.requestId } });
    expect(await seen('ADMIN')).toEqual({ token: { id }, request: { id: lab.requestId } });
  });
});

describe('the process does not start', () => {
  it('with a root field that has no access rule', () => {
    const open = readSdl().replace(
      /(releasePublished\([\s\S]*?\): Release!) @access\(roles: \[[A-Z, ]+\]\)/,
      '$1',
    );
    expect(() => createSchema(open)).toThrow('No @access rule for Subscription.releasePublished.');
  });

  it('with a root field that nothing stands behind, or a resolver for nothing', () => {
    const more = `${readSdl()}\nextend type Query { ghost: Int @access(roles: [ADMIN]) }`;
    expect(() => createSchema(more)).toThrow('There is no resolver for Query.ghost.');
    const less = readSdl().replace(/\btokens: \[Token!\]!/, 'allTokens: [Token!]!');
    expect(() => createSchema(less)).toThrow(
      'There is a resolver for Query.tokens, which is not in the schema.',
    );
  });
});
