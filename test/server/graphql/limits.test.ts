import { type OperationDefinitionNode, parse } from 'graphql';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { LIMITS } from '../../../schema/limits.ts';
import { measure } from '../../../server/graphql/measure.ts';
import { createSchema } from '../../../server/graphql/schema.ts';
import { type Service, startService } from '../rest/service.ts';
import { ask, read } from './ask.ts';

const schema = createSchema();

function measured(query: string, variables: Record<string, unknown> = {}) {
  const document = parse(query);
  return measure(schema, document, document.definitions[0] as OperationDefinitionNode, variables);
}

/** Every expected number below is the contract's rule, added up by hand. */
describe('what an operation measures', () => {
  it('is one a field, times the sizes of the lists around it [published]', () => {
    expect(measured('{ me { role } service { version } }')).toEqual({
      depth: 2,
      aliases: 0,
      cost: 4,
      points: 0,
    });
    // chips, edges, then three times (node, serial).
    expect(measured('{ chips(first: 3) { edges { node { serial } } } }').cost).toBe(2 + 3 * 2);
    // Without `first` 50.
    expect(measured('{ chips { edges { node { serial } } pageInfo { endCursor } } }').cost).toBe(
      2 + 50 * 2 + 2,
    );
    // A list without pages counts as ten: chip, releases, ten times (name, version, number).
    expect(measured('{ chip(serial: "x") { releases { name version { number } } } }').cost).toBe(2 + 10 * 3);
  });

  it('is 20 and a hundredth of the points for a curve, 20 for figures, and the points add up', () => {
    const one = '{ design(id: "x") { response { transmissionDb } } }';
    expect(measured(one)).toMatchObject({ cost: 1 + (1 + 20 + 20.01 + 1), points: 2001 });
    const grid =
      '{ design(id: "x") { response(reduceTo: 10, grid: {offsetGhz: {start: 0, stop: 1, points: 500}}) { floorDb } } }';
    expect(measured(grid)).toMatchObject({ cost: 1 + (1 + 20 + 5 + 1), points: 500 });
    const many =
      'query ($g: GridInput) { designs(first: 4) { edges { node { response(grid: $g) { floorDb } figures { rippleDb } } } } }';
    const variables = { g: { frequencyThz: { start: 193, stop: 194, points: 1000 } } };
    expect(measured(many, variables)).toMatchObject({
      cost: 2 + 4 * (1 + (1 + 20 + 10 + 1) + (1 + 20 + 1)),
      points: 4000,
    });
  });

  it('takes sizes from variables and their defaults', () => {
    const query = 'query ($n: Int = 7) { chips(first: $n) { edges { node { serial } } } }';
    expect(measured(query).cost).toBe(2 + 7 * 2);
    expect(measured(query, { n: 100 }).cost).toBe(2 + 100 * 2);
  });

  it('counts fragments where they are spread, once a spread, and one in itself as endless', () => {
    const spread =
      '{ a: chip(serial: "x") { ...F } b: chip(serial: "y") { ...F ...F } } fragment F on Chip { serial ... on Node { i: id } }';
    expect(measured(spread)).toEqual({ depth: 2, aliases: 2 + 3, cost: 2 + 3 * 2, points: 0 });
    const cyclic =
      '{ chip(serial: "x") { ...A } } fragment A on Chip { head { ...B } } fragment B on ChipRevision { chip { ...A } }';
    expect(measured(cyclic)).toMatchObject({
      depth: Number.POSITIVE_INFINITY,
      cost: Number.POSITIVE_INFINITY,
    });
  });

  it('does not count the depth of introspection', () => {
    expect(
      measured('{ __schema { types { fields { type { ofType { ofType { ofType { name } } } } } } } }').depth,
    ).toBe(1);
  });
});

let service: Service;
beforeAll(async () => {
  service = await startService();
});
afterAll(() => service?.stop());

async function refused(query: string, variables?: Record<string, unknown>) {
  const { status, data, errors } = await ask(service, query, variables ? { variables } : {});
  return {
    status,
    data,
    code: errors[0]?.extensions.code,
    given: errors[0]?.extensions.given,
    allowed: errors[0]?.extensions.allowed,
  };
}

/** 2 n + 1 levels deep. */
const deep = (n: number) => `{ chip(serial: "x") { ${'head { chip { '.repeat(n)}id${' } }'.repeat(n)} } }`;

describe('an operation beyond the limits', () => {
  it('is refused when it is too deep, whatever hides the depth', async () => {
    expect(await refused(deep(5))).toMatchObject({ status: 200, data: { chip: null } });
    expect(await refused(deep(6))).toMatchObject({
      status: 400,
      data: null,
      code: 'QUERY_TOO_DEEP',
      given: 14,
      allowed: { max: 12 },
    });
    const hidden = `{ chip(serial: "x") { ...F0 } } ${Array.from({ length: 6 }, (_, i) => `fragment F${i} on Chip { head { chip { ... on Chip { id ...F${i + 1} } } } }`).join(' ')} fragment F6 on Chip { id }`;
    expect(await refused(hidden)).toMatchObject({ code: 'QUERY_TOO_DEEP', given: 14 });
    const cyclic = '{ chip(serial: "x") { ...F } } fragment F on Chip { head { chip { ...F } } }';
    expect(await refused(cyclic)).toMatchObject({ code: 'QUERY_TOO_DEEP', given: 'without end' });
    expect(await refused(`${'{a'.repeat(12_000)}${'}'.repeat(8_000)}`)).toMatchObject({
      status: 400,
      code: 'QUERY_TOO_DEEP',
    });
  });

  it('is refused when it is too wide', async () => {
    const aliases = (n: number) =>
      `{ ${Array.from({ length: n }, (_, i) => `a${i}: me { role }`).join(' ')} }`;
    expect(await refused(aliases(15))).toMatchObject({ status: 200 });
    expect(await refused(aliases(500))).toMatchObject({ status: 400, code: 'QUERY_TOO_EXPENSIVE' });
    const inner = `{ me { ${Array.from({ length: 30 }, (_, i) => `a${i}: role`).join(' ')} } }`;
    expect(await refused(inner)).toMatchObject({
      code: 'QUERY_TOO_EXPENSIVE',
      given: 31,
      allowed: { max: 30 },
    });
    const doubling = `{ me { actor { ...F0 } } } ${Array.from({ length: 40 }, (_, i) => `fragment F${i} on Actor { ...F${i + 1} ...F${i + 1} }`).join(' ')} fragment F40 on Actor { name }`;
    const begun = performance.now();
    expect(await refused(doubling)).toMatchObject({ code: 'QUERY_TOO_EXPENSIVE' });
    expect(performance.now() - begun).toBeLessThan(PATIENCE_MS);
  });

  it('is refused when it costs too much, by cost, by points, by what a variable says', async () => {
    const query =
      'query ($n: Int) { chips(first: $n) { edges { node { revisions(first: $n) { edges { node { number } } } } } } }';
    expect(await refused(query, { n: 10 })).toMatchObject({ status: 200 });
    expect(await refused(query, { n: 200 })).toMatchObject({
      status: 400,
      data: null,
      code: 'QUERY_TOO_EXPENSIVE',
      given: 2 + 200 * (1 + 1 + 1 + 200 * 2),
      allowed: { max: LIMITS.queryCost },
    });
    const curve = 'response(grid: {offsetGhz: {start: -1, stop: 1, points: 20001}}) { floorDb }';
    const points = `{ design(id: "x") { ${Array.from({ length: 5 }, (_, i) => `c${i}: ${curve}`).join(' ')} } }`;
    expect(await refused(points)).toMatchObject({
      code: 'QUERY_TOO_EXPENSIVE',
      given: 100_005,
      allowed: { max: 100_000 },
    });
  });

  it('is refused before its validation could take long', async () => {
    const begun = performance.now();
    const same = `{ me { role } } fragment Unused on Chip { ${'id '.repeat(10_000)} }`;
    expect(await refused(same)).toMatchObject({ status: 400, code: 'QUERY_TOO_EXPENSIVE' });
    const below = `{ me { ${'role '.repeat(200)} } }`;
    expect(await refused(below)).toMatchObject({ status: 200, data: { me: { role: 'DESIGNER' } } });
    expect(performance.now() - begun).toBeLessThan(PATIENCE_MS);
  });

  it('is refused when its document is too large, in bytes and not in characters', async () => {
    const padded = (bytes: number) => `{ me { role } } #${'x'.repeat(bytes - 17)}`;
    expect((await refused(padded(LIMITS.documentBytes))).status).toBe(200);
    expect(await refused(padded(LIMITS.documentBytes + 1))).toMatchObject({
      status: 413,
      code: 'TOO_LARGE',
      given: 32_769,
    });
    expect(await refused(`{ me { role } } #${'µ'.repeat(20_000)}`)).toMatchObject({
      status: 413,
      code: 'TOO_LARGE',
    });
    const body = JSON.stringify({ query: '{ me { role } }', variables: { x: 'x'.repeat(LIMITS.bodyBytes) } });
    const answer = await service.call('/graphql', { method: 'POST', body });
    expect([answer.status, answer.json.errors[0].extensions.code]).toEqual([413, 'TOO_LARGE']);
  });

  it('is refused in a batch', async () => {
    const answer = await service.call('/graphql', { method: 'POST', body: [{ query: '{ me { role } }' }] });
    expect([answer.status, answer.json.errors[0].extensions.code]).toEqual([400, 'BAD_INPUT']);
  });
  /** Seconds would be an attack's success; a loaded machine needs some hundred milliseconds. */
  const PATIENCE_MS = 3_000;
});

it('tells its limits', async () => {
  const { service: info } = await read(service, '{ service { version engineVersion limits } }');
  expect(info.limits).toMatchObject({
    queryDepth: 12,
    queryCost: 5000,
    aliases: 30,
    documentBytes: 32_768,
    subscriptions: 20,
  });
});
