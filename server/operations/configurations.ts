/** Configurations and their versions. */
import { canonicalJson } from '../../schema/jcs.ts';
import { saveVersionRule } from '../../schema/library.ts';
import { NAME_PATTERN } from '../../schema/text.ts';
import { actingOf, authorise } from '../auth/index.ts';
import { keyReused, notFound, preconditionFailed, refuse, staleChipRevision } from '../errors.ts';
import type { DesignRecord } from '../store/records.ts';
import { sha256Hex } from './address.ts';
import { cachedRequest } from './asked-request.ts';
import { isNumber } from './chips.ts';
import type { Context } from './context.ts';
import { hashOfDesignId } from './ids.ts';
import { connectionOf } from './lists.ts';
import type { Operations } from './operations.ts';
import { idempotencyOf, readInput } from './read-input.ts';

type ConfigurationOperations = Pick<
  Operations,
  | 'findConfiguration'
  | 'listConfigurations'
  | 'findVersion'
  | 'latestVersion'
  | 'listVersions'
  | 'saveVersion'
>;

/** Address of a version's content: what the instrument would set, and for which model of the chip. */
function contentHashOf(design: DesignRecord, revisionHash: string): string {
  return sha256Hex(canonicalJson({ chipRevision: revisionHash, setting: design.result.setting }));
}

export function configurationOperations(context: Context): ConfigurationOperations {
  const { store } = context;
  return {
    async findConfiguration(viewer, chip, name) {
      authorise(viewer, 'configuration.read');
      return NAME_PATTERN.test(name) ? store.findConfiguration(chip.id, name) : null;
    },
    async listConfigurations(viewer, chip, ask) {
      authorise(viewer, 'configuration.read');
      return connectionOf(ask, {
        context: { list: 'configurations', chip: chip.id },
        read: (page) => store.listConfigurations(chip.id, page),
        nodeOf: (row) => row,
      });
    },
    async findVersion(viewer, configuration, number) {
      authorise(viewer, 'configuration.read');
      return isNumber(number) ? store.findVersion(configuration.id, number) : null;
    },
    async latestVersion(viewer, configuration) {
      authorise(viewer, 'configuration.read');
      return store.findVersion(configuration.id, configuration.lastVersion);
    },
    async listVersions(viewer, configuration, ask) {
      authorise(viewer, 'configuration.read');
      return connectionOf(ask, {
        context: { list: 'versions', configuration: configuration.id },
        read: (page) => store.listVersions(configuration.id, page),
        nodeOf: (row) => row,
      });
    },
    async saveVersion(viewer, body, options) {
      authorise(viewer, 'version.save');
      const input = readInput(saveVersionRule, body);
      const chip = await context.chipBySerial(input.chip);
      const hash = hashOfDesignId(input.design);
      const design = hash === null ? null : await context.findDesign(hash);
      if (design === null) throw notFound('such design', '/design', input.design);
      if (design.chipId !== chip.id) {
        const more = { pointer: '/design', given: input.design };
        throw refuse('BAD_INPUT', `The design is not for chip ${chip.serial}.`, more);
      }
      const revision = await context.revisionById(design.chipRevisionId);
      if (revision === null) throw new Error(`design ${design.id} has no chip revision`);
      const idempotency = idempotencyOf('saveVersion', input, body, options);
      const { configuration, expectedVersion, note = '' } = input;
      const saved = await store.saveVersion(
        actingOf(viewer),
        {
          chipId: chip.id,
          configuration,
          designId: design.id,
          designRevisionId: design.chipRevisionId,
          setting: design.result.setting,
          contentHash: contentHashOf(design, revision.hash),
          note,
          ...(expectedVersion === undefined ? {} : { expectedVersion }),
        },
        idempotency,
      );
      switch (saved.outcome) {
        case 'WRITTEN':
          return saved;
        case 'KEY_REUSED':
          throw keyReused(idempotency?.key ?? '');
        case 'VERSION_MOVED':
          throw preconditionFailed(
            `The last version of ${configuration} is ${saved.lastVersion}, not ${expectedVersion}.`,
            { pointer: '/expectedVersion', given: expectedVersion, allowed: saved.lastVersion },
          );
        case 'STALE_CHIP_REVISION': {
          // What helps is no other save: it is the same filter asked again for the chip as it is known now.
          const asked = cachedRequest(design, chip, revision).asked as Readonly<Record<string, unknown>>;
          throw staleChipRevision(
            `The design is for revision ${revision.number} of chip ${chip.serial}, which is at ${saved.headRevision} by now; request it again (allowed.requestDesign) and save that design.`,
            {
              pointer: '/design',
              given: input.design,
              allowed: {
                chipRevision: saved.headRevision,
                requestDesign: { ...asked, chipRevision: saved.headRevision },
              },
            },
          );
        }
      }
    },
  };
}
