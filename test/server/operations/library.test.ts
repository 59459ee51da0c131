import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import type { NodeRecord } from '../../../server/operations/index.ts';
import { designId, historyId, releaseId, wireId } from '../../../server/operations/index.ts';
import type { DesignRecord } from '../../../server/store/index.ts';
import { smallModel } from '../../schema/invented-models.ts';
import { type Lab, openLab, refusalOf } from './lab.ts';

let lab: Lab;
let good: DesignRecord;
let missed: DesignRecord;

async function design(body: unknown): Promise<DesignRecord> {
  await lab.compute(await lab.operations.requestDesign(lab.viewers.DESIGNER, body));
  const done = await lab.operations.requestDesign(lab.viewers.DESIGNER, body);
  if (done.design === undefined) throw new Error('not computed');
  return done.design;
}

/** Second order, passing within `lossDb` of the light sent in. */
const masked = (lossDb: number) => ({
  chip: 'X1',
  specification: {
    mask: {
      family: 'BUTTERWORTH',
      order: 2,
      bands: [
        { interval: { offsetGhz: { low: -1, high: 1 } }, minTransmissionDb: -lossDb, output: 'OUT2' },
        { interval: { offsetGhz: { low: 24, high: 26 } }, maxTransmissionDb: -10, output: 'OUT2' },
      ],
    },
  },
});

beforeAll(async () => {
  lab = await openLab();
  good = await design(masked(3));
  // The losses of any chip miss 0.001 dB.
  missed = await design(masked(0.001));
});
afterAll(() => lab.close());

const mine = () => lab.viewers.DESIGNER;
const chip = async () => {
  const found = await lab.operations.findChip(mine(), 'X1');
  if (found === null) throw new Error('no chip');
  return found;
};
const save = (record: DesignRecord, more = {}) =>
  lab.operations.saveVersion(mine(), {
    chip: 'X1',
    configuration: 'demo',
    design: designId(record.id),
    ...more,
  });
const publish = (version: number, more = {}) =>
  lab.operations.publishRelease(mine(), { chip: 'X1', configuration: 'demo', version, ...more });

describe('a chip', () => {
  it('[property] is registered once, and the same key answers it again', async () => {
    const body = { serial: 'X2', description: 'invented', model: smallModel() };
    const made = await lab.operations.registerChip(mine(), body, { idempotencyKey: 'r1' });
    expect(await lab.operations.registerChip(mine(), body, { idempotencyKey: 'r1' })).toMatchObject({
      replayed: true,
      record: { id: made.record.id },
    });
    expect(await refusalOf(lab.operations.registerChip(mine(), body))).toMatchObject({
      code: 'NAME_TAKEN',
      status: 409,
    });
  });

  it('[property] is revised by those who have seen its head, and stays the same for the same content', async () => {
    const revise = (more: object) =>
      lab.operations.reviseChip(mine(), { chip: 'X2', expectedRevision: 1, model: smallModel(), ...more });
    expect((await revise({})).record.number).toBe(1);
    expect(
      (await revise({ model: { ...smallModel(), temperatureC: 25 }, note: 'warmer' })).record.number,
    ).toBe(2);
    expect(await refusalOf(revise({}))).toMatchObject({ code: 'PRECONDITION_FAILED', allowed: 2 });
    const head = await lab.operations.findChip(mine(), 'X2');
    expect(head?.headRevision).toBe(2);
    const revisions = await lab.operations.listRevisions(mine(), head!, { first: 1 });
    expect(revisions.edges[0]?.node.number).toBe(2);
    expect(revisions.pageInfo.hasNextPage).toBe(true);
  });
});

describe('versions and releases', () => {
  it('[property] are numbered, and refused where somebody was faster', async () => {
    expect((await save(good, { expectedVersion: 0 })).record.number).toBe(1);
    expect((await save(good, { expectedVersion: 1, note: 'again' })).record.number).toBe(2);
    expect(await refusalOf(save(good, { expectedVersion: 1 }))).toMatchObject({
      code: 'PRECONDITION_FAILED',
      allowed: 2,
    });
    expect(good.met).toBe(true);
    expect((await publish(1, { expectedSequence: 0, accept: codesOf(good) })).record.sequence).toBe(1);
    expect(await refusalOf(publish(2, { expectedSequence: 0, accept: codesOf(good) }))).toMatchObject({
      code: 'PRECONDITION_FAILED',
      allowed: 1,
    });
    expect((await lab.operations.findRelease(lab.viewers.INSTRUMENT, 'X1', 'current'))?.version.number).toBe(
      1,
    );
  });

  it('[property] that miss their mask are published only by who accepts it', async () => {
    expect(missed.met).toBe(false);
    const version = (await save(missed)).record.number;
    const refused = await refusalOf(publish(version));
    expect(refused).toMatchObject({ code: 'CAUTION_NOT_ACCEPTED', status: 409 });
    expect(refused.allowed).toContain('MASK_NOT_MET');
    const { record } = await lab.operations.publishRelease(mine(), refused.nearest[0]?.input);
    expect(record.accepted).toContain('MASK_NOT_MET');
    // A code that nothing called for is not on record.
    const again = await publish(version, {
      accept: [...record.accepted, 'STALE_CHIP_REVISION', 'NEVER_SEEN'],
    });
    expect(again.record.accepted).toEqual(record.accepted);
  });

  it('[property] of things that are not there are refused at their place', async () => {
    expect(await refusalOf(publish(99))).toMatchObject({ code: 'NOT_FOUND', pointer: '/version' });
    expect(await refusalOf(publish(1, { configuration: 'none' }))).toMatchObject({
      pointer: '/configuration',
    });
    expect(await refusalOf(save(good, { design: `dsn_${'0'.repeat(64)}` }))).toMatchObject({
      pointer: '/design',
    });
    await lab.operations.registerChip(mine(), { serial: 'X3', model: smallModel() });
    expect(await refusalOf(save(good, { chip: 'X3' }))).toMatchObject({
      code: 'BAD_INPUT',
      pointer: '/design',
    });
  });

  it('[property] of an older revision of the chip need a new design, or the old version taken knowingly', async () => {
    const model = { ...smallModel(), temperatureC: 30 };
    await lab.operations.reviseChip(mine(), { chip: 'X1', expectedRevision: 1, model });
    const stale = await refusalOf(save(good));
    expect(stale).toMatchObject({ code: 'STALE_CHIP_REVISION', allowed: { chipRevision: 2 } });
    const { requestDesign } = stale.allowed as { requestDesign: unknown };
    expect(await lab.operations.requestDesign(mine(), requestDesign)).toMatchObject({ state: 'QUEUED' });

    const accept = codesOf(good);
    const refused = await refusalOf(publish(2, { accept }));
    expect(refused).toMatchObject({ code: 'STALE_CHIP_REVISION', pointer: '/version' });
    const { record } = await lab.operations.publishRelease(mine(), refused.nearest[0]?.input);
    expect(record.accepted).toContain('STALE_CHIP_REVISION');
    const old = { ...masked(3), chipRevision: 1 };
    const asked = await refusalOf(lab.operations.requestDesign(mine(), old));
    expect(asked.nearest[0]?.input).toEqual({ ...masked(3), chipRevision: 2 });
  });
});

function codesOf(record: DesignRecord): string[] {
  return [...new Set(record.result.setting.cautions.map((caution) => caution.code))];
}

describe('anything by its id', () => {
  it('[property] is found by who may see it', async () => {
    const { operations, viewers } = lab;
    const one = await chip();
    const configuration = await operations.findConfiguration(mine(), one, 'demo');
    const version = await operations.latestVersion(mine(), configuration!);
    const release = await operations.findRelease(mine(), 'X1', 'current');
    const history = await operations.listHistory(mine(), { first: 1 });
    const ids: Readonly<Record<string, NodeRecord['type']>> = {
      [wireId('chp', one.id)]: 'Chip',
      [wireId('rev', good.chipRevisionId)]: 'ChipRevision',
      [designId(good.id)]: 'Design',
      [wireId('cfg', configuration!.id)]: 'Configuration',
      [wireId('ver', version!.id)]: 'ConfigurationVersion',
      [releaseId(release!)]: 'Release',
      [wireId('act', mine().actor.id)]: 'Actor',
      [wireId('tok', mine().tokenId)]: 'Token',
      [historyId(history.edges[0]!.node.id)]: 'HistoryEntry',
    };
    for (const [id, type] of Object.entries(ids)) {
      expect([id, (await operations.node(mine(), id))?.type]).toEqual([id, type]);
    }
    expect(await operations.node(viewers.READER, wireId('tok', mine().tokenId))).toBeNull();
    expect(await operations.node(viewers.INSTRUMENT, historyId(history.edges[0]!.node.id))).toBeNull();
    for (const nothing of ['', 'x', 'chp_', 'chp_zzz', 'dsn_12', 'toString']) {
      expect(await operations.node(mine(), nothing)).toBeNull();
    }
  });
});

describe('tokens and history', () => {
  it("[property] are made and revoked by administrators, one's own token by oneself", async () => {
    const { operations, viewers } = lab;
    expect(await refusalOf(operations.listTokens(mine()))).toMatchObject({
      code: 'FORBIDDEN',
      allowed: ['ADMIN'],
    });
    const ask = { actor: 'invented bench', role: 'INSTRUMENT', label: 'bench' };
    const past = { ...ask, expiresAt: '2020-01-01T00:00:00Z' };
    expect(await refusalOf(operations.createToken(viewers.ADMIN, past))).toMatchObject({
      pointer: '/expiresAt',
    });
    const { record } = await operations.createToken(viewers.ADMIN, ask);
    expect(record.actor.kind).toBe('INSTRUMENT');
    const id = wireId('tok', record.id);
    expect(await refusalOf(operations.revokeToken(mine(), { id }))).toMatchObject({ code: 'FORBIDDEN' });
    const own = await operations.revokeToken(lab.colleague, { id: wireId('tok', lab.colleague.tokenId) });
    expect(own.revokedAt).not.toBeNull();
    const last = { id: wireId('tok', viewers.ADMIN.tokenId) };
    expect(await refusalOf(operations.revokeToken(viewers.ADMIN, last))).toMatchObject({
      code: 'LAST_ADMIN',
      status: 409,
    });
  });

  it('[property] tell who did what, narrowed by chip, actor and action', async () => {
    const filter = { chip: 'X1', action: 'release.published', actor: wireId('act', mine().actor.id) };
    const entries = await lab.operations.listHistory(lab.viewers.READER, { filter });
    expect(entries.edges.length).toBe(4);
    expect(entries.edges.every((edge) => edge.node.actor.name === 'invented designer')).toBe(true);
    expect(await refusalOf(lab.operations.listHistory(lab.viewers.INSTRUMENT, {}))).toMatchObject({
      code: 'FORBIDDEN',
    });
  });
});

describe('a curve', () => {
  const curve = (ask: object) => lab.operations.designCurve(lab.viewers.INSTRUMENT, good, ask);

  it('[property] is the same on a grid in nm, THz and GHz, ascending in frequency', async () => {
    const inNm = await curve({ grid: { wavelengthNm: { start: 1552.3, stop: 1552.7, points: 41 } } });
    expect(inNm.wavelengthNm.at(0)).toBeCloseTo(1552.7, 9);
    expect(inNm.wavelengthNm.at(-1)).toBeCloseTo(1552.3, 9);
    expect(inNm.offsetGhz.every((offset, i) => i === 0 || offset > inNm.offsetGhz[i - 1]!)).toBe(true);
    const [low, high] = [inNm.frequencyThz.at(0)!, inNm.frequencyThz.at(-1)!];
    const inThz = await curve({ grid: { frequencyThz: { start: low, stop: high, points: 2 } } });
    expect(inThz.transmissionDb[0]).toBeCloseTo(inNm.transmissionDb[0]!, 6);
    expect(inThz.transmissionDb[1]).toBeCloseTo(inNm.transmissionDb.at(-1)!, 6);
  });

  it('[property] keeps its least and greatest transmission when it is reduced', async () => {
    const whole = await curve({ output: 'OUT2' });
    const reduced = await curve({ output: 'OUT2', reduceTo: 40 });
    expect([whole.reduced, reduced.reduced]).toEqual([false, true]);
    expect(reduced.offsetGhz.length).toBeLessThanOrEqual(40);
    expect(Math.max(...reduced.transmissionDb)).toBe(Math.max(...whole.transmissionDb));
    expect(Math.min(...reduced.transmissionDb)).toBe(Math.min(...whole.transmissionDb));
  });

  it('[property] has its missing delays listed in gaps', async () => {
    const { groupDelayPs, gaps } = await curve({
      stage: 'TARGET',
      output: 'OUT1',
      grid: { offsetGhz: { start: -25, stop: 25, points: 10_001 } },
    });
    const listed = new Set(
      gaps.flatMap(({ from, to }) => Array.from({ length: to - from + 1 }, (_, i) => from + i)),
    );
    expect(groupDelayPs.every((delay, i) => (delay === null) === listed.has(i))).toBe(true);
  });

  it('[property] of too many points is refused with what is allowed', async () => {
    const grid = { offsetGhz: { start: -1, stop: 1, points: 100_000 } };
    const problem = await refusalOf(curve({ grid }));
    expect(problem).toMatchObject({
      status: 422,
      limit: 'GRID_POINTS',
      pointer: '/grid/offsetGhz/points',
      allowed: { max: 20_001 },
    });
    expect(await refusalOf(curve({ grid: { offsetGhz: { start: 1, stop: 1, points: 3 } } }))).toMatchObject({
      status: 422,
    });
  });
});
