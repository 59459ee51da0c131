import { afterAll, beforeAll, beforeEach, describe, expect, it } from 'vitest';
import type { StoreEvent } from '../../../server/store/index.ts';
import {
  isBlocked,
  type Library,
  MODEL,
  makeChip,
  makeDesign,
  openLibrary,
  questionOf,
  reviseAsk,
  revisionText,
  SETTING,
  saveVersion,
  sha256,
  type TestChip,
} from '../../support/library.ts';

describe('chips, configurations and releases', () => {
  let library: Library;
  let on: TestChip;
  let designId: string;
  let seed = 0;

  beforeAll(async () => {
    library = await openLibrary();
  });
  afterAll(() => library.close());
  beforeEach(async () => {
    on = await makeChip(library, `C-${seed++}`);
    designId = (await makeDesign(library, questionOf(on, 'design'))).id;
  });

  const saveAsk = (expectedVersion?: number) => ({
    chipId: on.chip.id,
    configuration: 'il50',
    designId,
    designRevisionId: on.revision.id,
    setting: SETTING,
    contentHash: sha256('setting'),
    note: '',
    ...(expectedVersion === undefined ? {} : { expectedVersion }),
  });
  const publishAsk = (versionId: string, expectedSequence?: number, accepted: readonly string[] = []) => ({
    chipId: on.chip.id,
    name: 'current',
    versionId,
    note: '',
    accepted,
    ...(expectedSequence === undefined ? {} : { expectedSequence }),
  });

  describe('a chip', () => {
    it('is registered with its first revision, whose model is the one given', () => {
      expect(on.chip).toMatchObject({ headRevision: 1, retiredAt: null, createdBy: library.by.actorId });
      expect(on.revision).toMatchObject({ number: 1, chipId: on.chip.id, model: MODEL });
      expect(on.revision).not.toHaveProperty('canonical');
    });

    it('has a serial of its own', async () => {
      const again = await library.store.registerChip(library.by, {
        serial: on.chip.serial,
        description: '',
        model: MODEL,
        ...revisionText(on.chip.serial, 1, MODEL),
      });
      expect(again).toEqual({ outcome: 'NAME_TAKEN' });
    });

    it('registered by two at once is registered by one', async () => {
      const ask = { serial: 'twice', description: '', model: MODEL, ...revisionText('twice', 1, MODEL) };
      const both = await Promise.all([1, 2].map(() => library.store.registerChip(library.by, ask)));
      expect(both.map((one) => one.outcome).sort()).toEqual(['NAME_TAKEN', 'WRITTEN']);
    });

    it('is revised by one of two who saw the same head', async () => {
      const both = await Promise.all(
        [60, 70].map((fsr) => library.store.reviseChip(library.by, reviseAsk(on.chip, 1, fsr))),
      );
      expect(both.map((one) => one.outcome).sort()).toEqual(['STALE', 'WRITTEN']);
      expect(both.find((one) => one.outcome === 'STALE')).toEqual({ outcome: 'STALE', headRevision: 2 });
      expect((await library.store.findChip(on.chip.serial))?.headRevision).toBe(2);
    });

    it('revised with what it is already stays as it is', async () => {
      const same = await library.store.reviseChip(library.by, reviseAsk(on.chip, 1, 50));
      expect(same).toMatchObject({ outcome: 'WRITTEN', record: { id: on.revision.id, number: 1 } });
      expect(await library.store.findRevision(on.chip.id, 2)).toBeNull();
    });

    it('revised again with the same idempotency key answers the same revision', async () => {
      const key = { key: 'revise', operation: 'reviseChip', fingerprint: on.chip.id };
      const first = await library.store.reviseChip(library.by, reviseAsk(on.chip, 1, 61), key);
      const again = await library.store.reviseChip(library.by, reviseAsk(on.chip, 1, 61), key);
      expect(again).toEqual({ ...first, replayed: true });
      expect(
        await library.store.reviseChip(library.by, reviseAsk(on.chip, 2, 62), {
          ...key,
          fingerprint: 'other',
        }),
      ).toEqual({ outcome: 'KEY_REUSED' });
    });
  });

  describe('a version', () => {
    it('is numbered from 1 and carries its own copy of the setting', async () => {
      const one = await saveVersion(library, on, 'il50', designId);
      const two = await saveVersion(library, on, 'il50', designId);
      expect([one.number, two.number]).toEqual([1, 2]);
      expect(one).toMatchObject({
        configurationName: 'il50',
        chipRevisionNumber: 1,
        headRevision: 1,
        sourceKind: 'DESIGN',
        designId,
        setting: SETTING,
      });
      expect(await library.store.findVersion(one.configurationId, 2)).toEqual(two);
      expect(await library.store.findVersionById(one.id)).toEqual(one);
    });

    it('saved by many at once gets numbers without a gap or a repeat', async () => {
      const saved = await Promise.all(
        Array.from({ length: 10 }, () => saveVersion(library, on, 'many', designId)),
      );
      expect(saved.map((version) => version.number).sort((a, b) => a - b)).toEqual([
        1, 2, 3, 4, 5, 6, 7, 8, 9, 10,
      ]);
    });

    it('saved by two who expect the same number is saved by one; the other learns the present one', async () => {
      await saveVersion(library, on, 'il50', designId);
      const both = await Promise.all([1, 2].map(() => library.store.saveVersion(library.by, saveAsk(1))));
      expect(both.map((one) => one.outcome).sort()).toEqual(['VERSION_MOVED', 'WRITTEN']);
      expect(both.find((one) => one.outcome === 'VERSION_MOVED')).toEqual({
        outcome: 'VERSION_MOVED',
        lastVersion: 2,
      });
    });

    it('that expects a configuration to be there does not make one', async () => {
      expect(await library.store.saveVersion(library.by, saveAsk(3))).toEqual({
        outcome: 'VERSION_MOVED',
        lastVersion: 0,
      });
      expect(await library.store.findConfiguration(on.chip.id, 'il50')).toBeNull();
    });

    it('of a design for an older chip revision is refused', async () => {
      await library.store.reviseChip(library.by, reviseAsk(on.chip, 1, 60));
      expect(await library.store.saveVersion(library.by, saveAsk())).toEqual({
        outcome: 'STALE_CHIP_REVISION',
        headRevision: 2,
      });
    });

    it('waits for a revision in progress and then sees the new head', async () => {
      const revising = await library.session();
      await revising.query('begin');
      const { canonical, hash } = revisionText(on.chip.serial, 2, { ...MODEL, fsr: { fsrGhz: 99 } });
      await revising.query(
        'insert into chip_revision (id, chip_id, number, hash, canonical, created_by) values (gen_random_uuid(), $1, 2, $2, $3, $4)',
        [on.chip.id, hash, canonical, library.by.actorId],
      );
      await revising.query('update chip set head_revision = 2 where id = $1', [on.chip.id]);
      const saving = library.store.saveVersion(library.by, saveAsk());
      expect(await isBlocked(saving)).toBe(true);
      await revising.query('commit');
      expect(await saving).toEqual({ outcome: 'STALE_CHIP_REVISION', headRevision: 2 });
    });

    it('in progress keeps a revision waiting', async () => {
      const saving = await library.session();
      await saving.query('begin');
      await saving.query('select head_revision from chip where id = $1 for share', [on.chip.id]);
      const revising = library.store.reviseChip(library.by, reviseAsk(on.chip, 1, 60));
      expect(await isBlocked(revising)).toBe(true);
      await saving.query('commit');
      expect((await revising).outcome).toBe('WRITTEN');
    });

    it('saved again with the same idempotency key is the same version', async () => {
      const key = { key: `save-${seed}`, operation: 'saveVersion', fingerprint: 'f' };
      const first = await library.store.saveVersion(library.by, saveAsk(), key);
      expect(await library.store.saveVersion(library.by, saveAsk(), key)).toEqual({
        ...first,
        replayed: true,
      });
    });

    it('is found by the design it came from', async () => {
      const version = await saveVersion(library, on, 'il50', designId);
      const page = await library.store.listVersionsOfDesign(designId, { first: 10 });
      expect(page.rows.map(({ row }) => row.id)).toEqual([version.id]);
    });
  });

  describe('a release', () => {
    it('points its name at a version, and is pulled by serial and name', async () => {
      const version = await saveVersion(library, on, 'il50', designId);
      expect(await library.store.findRelease(on.chip.serial, 'current')).toBeNull();
      const published = await library.store.publishRelease(library.by, publishAsk(version.id, 0));
      expect(published).toMatchObject({
        outcome: 'WRITTEN',
        record: { sequence: 1, current: true, version: { id: version.id } },
      });
      const pulled = await library.store.findRelease(on.chip.serial, 'current');
      expect(published).toMatchObject({ record: pulled });
      expect(pulled?.version.setting).toEqual(SETTING);
    });

    it('going back is publishing the older version; the log keeps every step', async () => {
      const one = await saveVersion(library, on, 'il50', designId);
      const two = await saveVersion(library, on, 'il50', designId);
      for (const version of [one, two, one])
        await library.store.publishRelease(library.by, publishAsk(version.id));
      const log = await library.store.listReleaseLog(on.chip.id, 'current', { first: 10 });
      expect(log.rows.map(({ row }) => [row.sequence, row.version.number, row.current])).toEqual([
        [3, 1, true],
        [2, 2, false],
        [1, 1, false],
      ]);
      expect((await library.store.listReleases(on.chip.id)).map((row) => row.sequence)).toEqual([3]);
      expect((await library.store.listReleasesOfVersion(one.id)).map((row) => row.sequence)).toEqual([3, 1]);
      expect((await library.store.findReleaseBySequence(on.chip.id, 'current', 2))?.version.id).toBe(two.id);
    });

    it('published by two who expect the same present one is published by one', async () => {
      const version = await saveVersion(library, on, 'il50', designId);
      for (const expected of [0, 1]) {
        const both = await Promise.all(
          [1, 2].map(() => library.store.publishRelease(library.by, publishAsk(version.id, expected))),
        );
        expect(both.map((one) => one.outcome).sort()).toEqual(['SEQUENCE_MOVED', 'WRITTEN']);
        expect(both.find((one) => one.outcome === 'SEQUENCE_MOVED')).toEqual({
          outcome: 'SEQUENCE_MOVED',
          sequence: expected + 1,
        });
      }
    });

    it('that expects a present one where there is none leaves nothing behind', async () => {
      const version = await saveVersion(library, on, 'il50', designId);
      expect(await library.store.publishRelease(library.by, publishAsk(version.id, 4))).toEqual({
        outcome: 'SEQUENCE_MOVED',
        sequence: 0,
      });
      expect(await library.store.listReleases(on.chip.id)).toEqual([]);
    });

    it('of a version for an older chip revision needs to be accepted', async () => {
      const version = await saveVersion(library, on, 'il50', designId);
      await library.store.reviseChip(library.by, reviseAsk(on.chip, 1, 60));
      expect(await library.store.publishRelease(library.by, publishAsk(version.id))).toEqual({
        outcome: 'STALE_CHIP_REVISION',
        headRevision: 2,
      });
      const accepted = await library.store.publishRelease(
        library.by,
        publishAsk(version.id, undefined, ['STALE_CHIP_REVISION']),
      );
      expect(accepted).toMatchObject({
        outcome: 'WRITTEN',
        record: { accepted: ['STALE_CHIP_REVISION'], version: { chipRevisionNumber: 1, headRevision: 2 } },
      });
    });

    it('is announced at its commit and not before, once, and can be read by whoever hears of it', async () => {
      const version = await saveVersion(library, on, 'il50', designId);
      const heard: StoreEvent[] = [];
      const found: (number | undefined)[] = [];
      const stop = library.store.notifications.subscribe((event) => {
        if (event.kind !== 'RELEASE' || event.chipSerial !== on.chip.serial) return;
        heard.push(event);
        library.store
          .findRelease(event.chipSerial, event.name)
          .then((release) => found.push(release?.sequence));
      });
      // Holds the publication back at its last lock.
      const holder = await library.session();
      await holder.query('begin');
      await holder.query("insert into release_head (chip_id, name, sequence) values ($1, 'current', 1)", [
        on.chip.id,
      ]);
      const publishing = library.store.publishRelease(library.by, publishAsk(version.id));
      expect(await isBlocked(publishing)).toBe(true);
      expect(heard).toEqual([]);
      await holder.query('rollback');
      await publishing;
      await expect.poll(() => found).toEqual([1]);
      expect(heard).toEqual([{ kind: 'RELEASE', chipSerial: on.chip.serial, name: 'current', sequence: 1 }]);
      stop();
    });

    it('published again with the same idempotency key is the same release', async () => {
      const version = await saveVersion(library, on, 'il50', designId);
      const key = { key: `publish-${seed}`, operation: 'publishRelease', fingerprint: 'f' };
      const first = await library.store.publishRelease(library.by, publishAsk(version.id), key);
      expect(await library.store.publishRelease(library.by, publishAsk(version.id), key)).toEqual({
        ...first,
        replayed: true,
      });
    });
  });
});
