import type pg from 'pg';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { ask, read } from './ask.ts';
import { type Lab, openLab, registerChip, SERIAL } from './lab.ts';

let lab: Lab;
beforeAll(async () => {
  lab = await openLab();
});
afterAll(() => lab?.service.stop());

describe('lists', () => {
  const serials = ['LIST-A', 'LIST-B', 'LIST-C', 'LIST-D'];
  beforeAll(async () => {
    for (const serial of serials) await registerChip(lab.service, serial);
  });

  it('go through in pages, each entry once, in order', async () => {
    const query =
      'query ($after: String) { chips(first: 2, after: $after) { edges { cursor node { serial } } pageInfo { hasNextPage hasPreviousPage startCursor endCursor } } }';
    const seen: string[] = [];
    let after: string | null = null;
    for (;;) {
      const { chips } = await read(lab.service, query, { variables: { after } });
      seen.push(...chips.edges.map(({ node }: { node: { serial: string } }) => node.serial));
      expect(chips.pageInfo.hasPreviousPage).toBe(after !== null);
      expect(chips.pageInfo.startCursor).toBe(chips.edges[0].cursor);
      after = chips.pageInfo.endCursor;
      if (!chips.pageInfo.hasNextPage) break;
    }
    expect(seen).toEqual([...new Set(seen)].sort());
    expect(seen).toEqual(expect.arrayContaining([...serials, SERIAL]));
  });

  it('refuse a cursor of another list or another filter, and sizes that are none', async () => {
    const { chips } = await read(lab.service, '{ chips(first: 1) { pageInfo { endCursor } } }');
    const variables = { after: chips.pageInfo.endCursor };
    for (const list of [
      'designs(after: $after)',
      'designRequests(after: $after)',
      'history(after: $after)',
    ]) {
      const { errors } = await ask(lab.service, `query ($after: String) { ${list} { edges { cursor } } }`, {
        variables,
      });
      expect([list, errors[0]?.extensions.code]).toEqual([list, 'BAD_CURSOR']);
    }
    for (const first of [-1, 201]) {
      const { status, errors } = await ask(lab.service, `{ chips(first: ${first}) { edges { cursor } } }`);
      expect([first, status, errors[0]?.extensions]).toMatchObject([
        first,
        400,
        { code: 'BAD_INPUT', pointer: '/first', given: first },
      ]);
    }
  });

  it('narrow by filter', async () => {
    const query =
      'query ($filter: DesignFilter, $order: DesignOrder) { designs(filter: $filter, order: $order) { edges { node { id } } } }';
    const ids = async (filter: object, order?: string) => {
      const { designs } = await read(lab.service, query, {
        variables: { filter, ...(order ? { order } : {}) },
      });
      return designs.edges.map(({ node }: { node: { id: string } }) => node.id);
    };
    expect(await ids({ chip: SERIAL, family: 'CHEBYSHEV_I' })).toEqual([lab.designId]);
    expect(await ids({ family: 'ELLIPTIC' }, 'REJECTION')).toEqual([]);
    expect(await ids({ createdAfter: '2099-01-01T00:00:00Z' })).toEqual([]);
    const { designRequests } = await read(
      lab.service,
      '{ designRequests(filter: {state: [DONE], mine: true}) { edges { node { state } } } }',
    );
    expect(designRequests.edges.length).toBeGreaterThan(0);
    expect(designRequests.edges.every(({ node }: { node: { state: string } }) => node.state === 'DONE')).toBe(
      true,
    );
  });

  it('cost as many selects however long they are', async () => {
    const { pool } = lab.service.store;
    let queries = 0;
    const query = pool.query.bind(pool) as (...args: unknown[]) => unknown;
    pool.query = ((...args: unknown[]) => {
      queries += 1;
      return query(...args);
    }) as pg.Pool['query'];
    const selectsOf = async (text: string) => {
      await read(lab.service, text);
      queries = 0;
      await read(lab.service, text);
      return queries;
    };
    try {
      const chips = (first: number) => `{ chips(first: ${first}) { edges { node { serial createdBy { name }
        head { number createdBy { name } chip { serial } } release { version { source { ... on Design { id } } configuration { latest { number } } } } } } } }`;
      const short = await selectsOf(chips(1));
      expect(await selectsOf(chips(5))).toBeLessThanOrEqual(short + LEVELS_OF_RELEASE);
      const requests = (first: number) =>
        `{ designRequests(first: ${first}) { edges { node { id createdBy { name } chip { serial } chipRevision { number } design { id } } } } }`;
      const few = await selectsOf(requests(1));
      expect(await selectsOf(requests(4))).toBeLessThanOrEqual(few + 1);
    } finally {
      pool.query = query as pg.Pool['query'];
    }
  });
  /** The first chip alone may have no release: then version, design and configuration are not looked up. */
  const LEVELS_OF_RELEASE = 3;
});
