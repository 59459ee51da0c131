/** Publishing: from then on instruments pull this version and drive heaters with it. */
import { DEFAULT_RELEASE, publishReleaseRule } from '../../schema/library.ts';
import type { FieldProblem, Nearest } from '../../schema/problem.ts';
import { NAME_PATTERN } from '../../schema/text.ts';
import { STANDING_CAUTIONS } from '../../src/chip/index.ts';
import { actingOf, authorise, type Viewer } from '../auth/index.ts';
import { keyReused, notFound, preconditionFailed, refuse, staleChipRevision } from '../errors.ts';
import type { ReleaseRecord, VersionRecord } from '../store/records.ts';
import type { Context } from './context.ts';
import { connectionOf } from './lists.ts';
import type { Done, Operations, WriteOptions } from './operations.ts';
import { askedOf, idempotencyOf, readInput } from './read-input.ts';

/** A code that a release must name in `accept`. */
interface Risk {
  readonly code: string;
  readonly text: string;
}

/** Whoever publishes takes what this very setting warns of, and that a band is missed. */
async function risksOf(context: Context, version: VersionRecord): Promise<Risk[]> {
  const risks = new Map<string, Risk>();
  for (const { code, text, channel } of version.setting.cautions) {
    if (STANDING_CAUTIONS.includes(code)) continue;
    const where = channel === undefined ? '' : ` (channel ${channel})`;
    const known = risks.get(code);
    risks.set(code, {
      code,
      text: known === undefined ? `${text}${where}` : `${known.text}; ${text}${where}`,
    });
  }
  const design = await context.findDesign(version.designId);
  if (design !== null && !design.met && !risks.has('MASK_NOT_MET')) {
    const margin = design.worstMarginDb === null ? '' : ` by ${Math.abs(design.worstMarginDb).toFixed(2)} dB`;
    risks.set('MASK_NOT_MET', { code: 'MASK_NOT_MET', text: `A band is missed${margin}.` });
  }
  return [...risks.values()];
}

function withAccepted(
  body: unknown,
  accept: readonly string[],
  codes: readonly string[],
  reason: string,
): Nearest {
  const works = [...accept, ...codes];
  const changes = [{ pointer: '/accept', given: accept.length === 0 ? null : accept, works }];
  return { reason, changes, input: { ...askedOf(body), accept: works } };
}

function requireAccepted(risks: readonly Risk[], accept: readonly string[], body: unknown): void {
  const missing = risks.filter(({ code }) => !accept.includes(code));
  if (missing.length === 0) return;
  const codes = missing.map(({ code }) => code);
  const errors: FieldProblem[] = missing.map(({ code, text }) => ({
    code: 'CAUTION_NOT_ACCEPTED',
    pointer: '/accept',
    detail: `${code}: ${text}`,
    allowed: code,
  }));
  throw refuse(
    'CAUTION_NOT_ACCEPTED',
    `The version carries cautions that accept does not name: ${codes.join(', ')}.`,
    {
      pointer: '/accept',
      given: accept,
      allowed: codes,
      errors,
      nearest: [withAccepted(body, accept, codes, 'the same, the cautions read and taken')],
    },
  );
}

async function publish(
  context: Context,
  viewer: Viewer,
  body: unknown,
  options: WriteOptions | undefined,
): Promise<Done<ReleaseRecord>> {
  const { store } = context;
  const input = readInput(publishReleaseRule, body);
  const { name = DEFAULT_RELEASE, expectedSequence, note = '', accept = [] } = input;
  const chip = await context.chipBySerial(input.chip);
  const configuration = await store.findConfiguration(chip.id, input.configuration);
  if (configuration === null) {
    throw notFound(
      `configuration ${input.configuration} of chip ${chip.serial}`,
      '/configuration',
      input.configuration,
    );
  }
  const version = await store.findVersion(configuration.id, input.version);
  if (version === null) {
    throw notFound(`version ${input.version} of ${configuration.name}`, '/version', input.version);
  }
  const risks = await risksOf(context, version);
  requireAccepted(risks, accept, body);
  // On record stands what was there to be taken; a list sent along out of habit takes nothing.
  const isStale = version.chipRevisionNumber < version.headRevision;
  const applying = [...risks.map(({ code }) => code), ...(isStale ? ['STALE_CHIP_REVISION'] : [])];
  const accepted = applying.filter((code) => accept.includes(code));
  const idempotency = idempotencyOf('publishRelease', input, body, options);
  const expected = expectedSequence === undefined ? {} : { expectedSequence };
  const published = await store.publishRelease(
    actingOf(viewer),
    { chipId: chip.id, name, versionId: version.id, note, accepted, ...expected },
    idempotency,
  );
  switch (published.outcome) {
    case 'WRITTEN':
      return published;
    case 'KEY_REUSED':
      throw keyReused(idempotency?.key ?? '');
    case 'SEQUENCE_MOVED':
      throw preconditionFailed(
        published.sequence === 0
          ? `Nothing was published under ${name} yet.`
          : `The last publication under ${name} is ${published.sequence}, not ${expectedSequence}.`,
        { pointer: '/expectedSequence', given: expectedSequence, allowed: published.sequence },
      );
    case 'STALE_CHIP_REVISION': {
      const { chipRevisionNumber } = version;
      const reason = 'the same, knowing that the chip has a newer revision';
      throw staleChipRevision(
        `The version is for revision ${chipRevisionNumber} of chip ${chip.serial}, which is at ${published.headRevision} by now.`,
        {
          pointer: '/version',
          given: input.version,
          allowed: { chipRevision: published.headRevision },
          nearest: [withAccepted(body, accept, ['STALE_CHIP_REVISION'], reason)],
        },
      );
    }
  }
}

type ReleaseOperations = Pick<
  Operations,
  | 'findRelease'
  | 'findReleaseHead'
  | 'findReleaseBySequence'
  | 'listReleases'
  | 'listReleaseLog'
  | 'listReleasesOfVersion'
  | 'publishRelease'
>;

export function releaseOperations(context: Context): ReleaseOperations {
  const { store } = context;
  return {
    async findRelease(viewer, serial, name) {
      authorise(viewer, 'release.read');
      const isName = NAME_PATTERN.test(serial) && NAME_PATTERN.test(name);
      return isName ? store.findRelease(serial, name) : null;
    },
    async findReleaseHead(viewer, serial, name) {
      authorise(viewer, 'release.read');
      const isName = NAME_PATTERN.test(serial) && NAME_PATTERN.test(name);
      return isName ? store.findReleaseHead(serial, name) : null;
    },
    async findReleaseBySequence(viewer, chipId, name, sequence) {
      authorise(viewer, 'release.read');
      return store.findReleaseBySequence(chipId, name, sequence);
    },
    async listReleases(viewer, chip) {
      authorise(viewer, 'release.read');
      return store.listReleases(chip.id);
    },
    async listReleaseLog(viewer, chip, name, ask) {
      authorise(viewer, 'release.read');
      return connectionOf(ask, {
        context: { list: 'releaseLog', chip: chip.id, name },
        read: (page) => store.listReleaseLog(chip.id, name, page),
        nodeOf: (row) => row,
      });
    },
    async listReleasesOfVersion(viewer, version) {
      authorise(viewer, 'release.read');
      return store.listReleasesOfVersion(version.id);
    },
    async publishRelease(viewer, body, options) {
      authorise(viewer, 'release.publish');
      return publish(context, viewer, body, options);
    },
  };
}
