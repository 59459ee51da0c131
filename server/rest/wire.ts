/**
 * Records as REST tells them: the views that GraphQL has too, and where GraphQL has an edge to another record, what a
 * script would look it up by: a chip's serial, a revision's number, a configuration's name, a design's id.
 */

import type { Viewer } from '../auth/index.ts';
import { notFound } from '../errors.ts';
import type { DesignRequest, Operations, SpecificationCheck } from '../operations/index.ts';
import { designId } from '../operations/index.ts';
import type {
  ChipRecord,
  ChipRevisionRecord,
  ConfigurationRecord,
  DesignRecord,
  HistoryRecord,
  ReleaseRecord,
  VersionRecord,
} from '../store/records.ts';
import {
  actorView,
  chipModelView,
  chipView,
  complianceView,
  configurationView,
  designView,
  historyView,
  releaseView,
  requestView,
  revisionView,
  settingView,
  specificationView,
  transferFunctionView,
  versionView,
} from '../views/index.ts';

/** Who asks, and where answers come from. */
export interface Wiring {
  readonly operations: Operations;
  readonly viewer: Viewer;
}

/** What a view needs of other records, looked up once a page. */
async function actorsOf({ operations, viewer }: Wiring, ids: readonly (string | null)[]) {
  const wanted = [...new Set(ids.filter((id) => id !== null))];
  const actors = wanted.length > 0 ? await operations.actorsById(viewer, wanted) : new Map();
  return (id: string | null) => {
    const actor = id === null ? undefined : actors.get(id);
    return actor ? actorView(actor) : null;
  };
}

async function serialsOf({ operations, viewer }: Wiring, ids: readonly (string | null)[]) {
  const wanted = [...new Set(ids.filter((id) => id !== null))];
  const chips = await Promise.all(
    wanted.map(async (id) => [id, await operations.chipById(viewer, id)] as const),
  );
  const serials = new Map(chips.map(([id, chip]) => [id, chip?.serial ?? null]));
  return (id: string | null): string | null => (id === null ? null : (serials.get(id) ?? null));
}

async function revisionsOf({ operations, viewer }: Wiring, ids: readonly string[]) {
  const wanted = [...new Set(ids)];
  const found = await Promise.all(
    wanted.map(async (id) => [id, await operations.revisionById(viewer, id)] as const),
  );
  const revisions = new Map(found);
  return (id: string): ChipRevisionRecord => {
    const revision = revisions.get(id);
    if (!revision) throw notFound('chip revision');
    return revision;
  };
}

export async function revisionsWire(wiring: Wiring, revisions: readonly ChipRevisionRecord[]) {
  const actors = await actorsOf(
    wiring,
    revisions.map(({ createdBy }) => createdBy),
  );
  return revisions.map((revision) => ({
    ...revisionView(revision),
    createdBy: actors(revision.createdBy),
    model: chipModelView(wiring.operations.modelOf(revision), revision.model),
  }));
}

/** With the head revision of each. */
export async function chipsWire(wiring: Wiring, chips: readonly ChipRecord[]) {
  const { operations, viewer } = wiring;
  const heads = await Promise.all(chips.map((chip) => operations.headRevision(viewer, chip)));
  const [actors, revisions] = await Promise.all([
    actorsOf(
      wiring,
      chips.map(({ createdBy }) => createdBy),
    ),
    revisionsWire(wiring, heads),
  ]);
  return chips.map((chip, index) => ({
    ...chipView(chip),
    createdBy: actors(chip.createdBy),
    head: revisions[index],
  }));
}

export async function requestsWire(wiring: Wiring, requests: readonly DesignRequest[]) {
  const [actors, serials, revisions] = await Promise.all([
    actorsOf(
      wiring,
      requests.map(({ createdBy }) => createdBy),
    ),
    serialsOf(
      wiring,
      requests.map(({ chipId }) => chipId),
    ),
    revisionsOf(
      wiring,
      requests.map(({ chipRevisionId }) => chipRevisionId),
    ),
  ]);
  return requests.map((request) => ({
    ...requestView(request),
    createdBy: actors(request.createdBy),
    chip: serials(request.chipId),
    chipRevision: revisions(request.chipRevisionId).number,
    design: request.designId === null ? null : designId(request.designId),
  }));
}

export async function designsWire(wiring: Wiring, designs: readonly DesignRecord[]) {
  const { operations } = wiring;
  const [serials, revisions] = await Promise.all([
    serialsOf(
      wiring,
      designs.map(({ chipId }) => chipId),
    ),
    revisionsOf(
      wiring,
      designs.map(({ chipRevisionId }) => chipRevisionId),
    ),
  ]);
  return designs.map((design) => {
    const { result } = design;
    const revision = revisions(design.chipRevisionId);
    const model = operations.modelOf(revision);
    const { specification } = JSON.parse(design.canonical) as {
      specification: Parameters<typeof specificationView>[0];
    };
    return {
      ...designView(design),
      chip: serials(design.chipId),
      chipRevision: revision.number,
      specification: specificationView(specification, model),
      output: result.output,
      transferFunction: transferFunctionView(result, result.output),
      circuit: { architecture: result.architecture, cells: result.cells },
      setting: settingView(result.setting),
      compliance: complianceView(result.compliance, model),
      figures: result.figures,
    };
  });
}

export async function versionsWire(wiring: Wiring, versions: readonly VersionRecord[]) {
  const actors = await actorsOf(
    wiring,
    versions.map(({ createdBy }) => createdBy),
  );
  return versions.map((version) => ({
    ...versionView(version),
    createdBy: actors(version.createdBy),
    configuration: version.configurationName,
    chipRevision: version.chipRevisionNumber,
    design: designId(version.designId),
  }));
}

/** With the latest version of each. */
export async function configurationsWire(wiring: Wiring, configurations: readonly ConfigurationRecord[]) {
  const { operations, viewer } = wiring;
  const latest = await Promise.all(
    configurations.map((configuration) => operations.latestVersion(viewer, configuration)),
  );
  const present = latest.filter((version) => version !== null);
  const [actors, versions] = await Promise.all([
    actorsOf(
      wiring,
      configurations.map(({ createdBy }) => createdBy),
    ),
    versionsWire(wiring, present),
  ]);
  const byId = new Map(present.map((version, index) => [version.configurationId, versions[index]]));
  return configurations.map((configuration) => ({
    ...configurationView(configuration),
    createdBy: actors(configuration.createdBy),
    lastVersion: configuration.lastVersion,
    latest: byId.get(configuration.id) ?? null,
  }));
}

export async function releasesWire(wiring: Wiring, releases: readonly ReleaseRecord[]) {
  const actors = await actorsOf(
    wiring,
    releases.map(({ createdBy }) => createdBy),
  );
  return releases.map((release) => ({
    ...releaseView(release),
    createdBy: actors(release.createdBy),
    chip: release.chipSerial,
    configuration: release.version.configurationName,
    version: release.version.number,
    chipRevision: release.version.chipRevisionNumber,
    stale: release.version.chipRevisionNumber < release.version.headRevision,
    design: designId(release.version.designId),
  }));
}

export async function historyWire(wiring: Wiring, entries: readonly HistoryRecord[]) {
  const serials = await serialsOf(
    wiring,
    entries.map(({ chipId }) => chipId),
  );
  return entries.map((entry) => ({
    ...historyView(entry),
    actor: actorView(entry.actor),
    chip: serials(entry.chipId),
    subjectKind: entry.subjectKind,
  }));
}

export function checkWire(operations: Operations, check: SpecificationCheck) {
  const { ok, order, rings, problem, specification, revision, designHash, cached } = check;
  return {
    ok,
    order,
    rings,
    problem,
    specification:
      specification && revision ? specificationView(specification, operations.modelOf(revision)) : null,
    chipRevision: revision?.number ?? null,
    designHash,
    cached,
  };
}
