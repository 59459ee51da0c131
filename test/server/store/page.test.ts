import fc from 'fast-check';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { InvalidSortKey, type Page, type PageAsk } from '../../../server/store/index.ts';
import {
  inventedDesign,
  type Library,
  makeChip,
  makeDesign,
  openLibrary,
  questionOf,
  reviseAsk,
  saveVersion,
  submit,
  type TestChip,
} from '../../support/library.ts';

/** Follows a list to its end, keys through JSON as a cursor takes them. */
async function walk<T>(list: (page: PageAsk) => Promise<Page<T>>, first: number): Promise<T[]> {
  const seen: T[] = [];
  let after: PageAsk['after'];
  for (;;) {
    const page = await list({ first, ...(after && { after }) });
    seen.push(...page.rows.map(({ row }) => row));
    expect(page.rows.length).toBeLessThanOrEqual(first);
    if (!page.hasNextPage) return seen;
    after = JSON.parse(JSON.stringify(page.rows.at(-1)!.sortKey)) as (string | number | null)[];
  }
}

describe('lists', () => {
  let library: Library;
  let on: TestChip;
  const REJECTIONS = [40, null, 35, 40, -3, null, 60, 12.5];

  beforeAll(async () => {
    library = await openLibrary();
    on = await makeChip(library, 'P-1');
    for (const serial of ['P-2', 'p-3', 'P_4', 'P.5']) await makeChip(library, serial);
    for (const [index, rejection] of REJECTIONS.entries()) {
      await makeDesign(library, questionOf(on, `page-${index}`), inventedDesign(rejection, index / 4));
    }
    // Several rows of one instant: the id must decide.
    for (let index = 0; index < 5; index++) await submit(library, questionOf(on, `open-${index}`));
    const [design] = (await library.store.listDesigns({}, 'NEWEST', { first: 1 })).rows;
    for (let index = 0; index < 5; index++) await saveVersion(library, on, 'il50', design!.row.id);
    for (const name of ['a', 'b']) await saveVersion(library, on, name, design!.row.id);
    for (let head = 1; head < 5; head++)
      await library.store.reviseChip(library.by, reviseAsk(on.chip, head, 60 + head));
  });
  afterAll(() => library.close());

  it('cut into pages of any size give every row once, in the order of the uncut list [property]', async () => {
    const { store } = library;
    const configuration = await store.findConfiguration(on.chip.id, 'il50');
    const lists: readonly ((page: PageAsk) => Promise<Page<unknown>>)[] = [
      (page) => store.listChips(page),
      (page) => store.listRevisions(on.chip.id, page),
      (page) => store.listDesigns({}, 'NEWEST', page),
      (page) => store.listDesigns({ chipId: on.chip.id }, 'REJECTION', page),
      (page) => store.listRequests({ states: ['QUEUED', 'DONE'] }, page),
      (page) => store.listConfigurations(on.chip.id, page),
      (page) => store.listVersions(configuration!.id, page),
      (page) => store.listHistory({}, page),
    ];
    const whole = await Promise.all(lists.map((list) => walk(list, 200)));
    expect(whole.map((rows) => rows.length > 2)).toEqual(lists.map(() => true));
    await fc.assert(
      fc.asyncProperty(fc.nat(lists.length - 1), fc.integer({ min: 1, max: 9 }), async (which, first) => {
        expect(await walk(lists[which]!, first)).toEqual(whole[which]);
      }),
      { numRuns: 30 },
    );
  });

  it('designs by rejection come best first, those without one last', async () => {
    const rows = await walk((page) => library.store.listDesigns({}, 'REJECTION', page), 3);
    expect(rows.map((row) => row.rejectionDb)).toEqual([60, 40, 40, 35, 12.5, -3, null, null]);
  });

  it('filters of designs narrow the list, together and alone', async () => {
    const { store } = library;
    const count = async (filter: Parameters<typeof store.listDesigns>[0]) =>
      (await store.listDesigns(filter, 'NEWEST', { first: 200 })).rows.length;
    const now = new Date();
    expect(await count({ chipId: on.chip.id })).toBe(8);
    expect(await count({ family: 'ELLIPTIC' })).toBe(0);
    expect(await count({ family: 'BUTTERWORTH', architecture: 'ALL_PASS_PAIR', met: true })).toBe(8);
    expect(await count({ met: false })).toBe(0);
    expect(await count({ minRejectionDb: 35 })).toBe(4);
    expect(await count({ maxInsertionLossDb: 0.5 })).toBe(3);
    expect(await count({ minRejectionDb: 35, maxInsertionLossDb: 0.5 })).toBe(2);
    expect(await count({ createdBefore: now })).toBe(8);
    expect(await count({ createdAfter: now })).toBe(0);
  });

  it('filters of requests and of the history too', async () => {
    const { store, by } = library;
    const requests = async (filter: Parameters<typeof store.listRequests>[0]) =>
      (await store.listRequests(filter, { first: 200 })).rows.length;
    expect(await requests({ states: ['QUEUED'] })).toBe(5);
    expect(await requests({ states: [] })).toBe(0);
    expect(await requests({ createdBy: by.actorId, chipId: on.chip.id })).toBe(13);
    expect(await requests({ createdBy: on.chip.id })).toBe(0);
    const history = async (filter: Parameters<typeof store.listHistory>[0]) =>
      (await store.listHistory(filter, { first: 200 })).rows.length;
    expect(await history({ action: 'chip.registered' })).toBe(5);
    expect(await history({ action: 'chip.registered', chipId: on.chip.id, actorId: by.actorId })).toBe(1);
    expect(await history({ after: new Date(Date.now() + 60_000) })).toBe(0);
    expect(await history({ before: new Date(0) })).toBe(0);
  });

  it('a position that this list never gave out is told apart from an error of the database', async () => {
    const wrong: PageAsk['after'][] = [
      [],
      ['x'],
      ['2026-01-01T00:00:00.000Z'],
      [null, 'x'],
      ['2026', "'; drop table design"],
    ];
    for (const after of wrong) {
      await expect(
        library.store.listDesigns({}, 'NEWEST', { first: 1, after: after! }),
      ).rejects.toBeInstanceOf(InvalidSortKey);
    }
    await expect(library.store.listHistory({}, { first: 1, after: [12] })).rejects.toBeInstanceOf(
      InvalidSortKey,
    );
    await expect(
      library.store.listRevisions(on.chip.id, { first: 1, after: [2 ** 40] }),
    ).rejects.toBeInstanceOf(InvalidSortKey);
  });
});
