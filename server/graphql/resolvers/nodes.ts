/** Records as objects of the schema: the plain members from the view, the record for the resolvers of the rest. */
import type { Connection, DesignRequest, NodeRecord } from '../../operations/index.ts';
import type {
  ActorRecord,
  ChipRecord,
  ChipRevisionRecord,
  ConfigurationRecord,
  DesignRecord,
  HistoryRecord,
  ReleaseRecord,
  TokenRecord,
  VersionRecord,
} from '../../store/records.ts';
import {
  actorView,
  chipView,
  configurationView,
  designView,
  historyView,
  releaseView,
  requestView,
  revisionView,
  tokenView,
  versionView,
} from '../../views/index.ts';
import type { GraphqlContext } from '../context.ts';
import { present } from './resolve.ts';

const node =
  <T extends string, R, V extends object>(typeName: T, viewOf: (record: R) => V) =>
  (record: R) => ({ __typename: typeName, ...viewOf(record), record });

export const actorNode = node('Actor', (record: ActorRecord) => actorView(record));
export const chipNode = node('Chip', (record: ChipRecord) => chipView(record));
export const revisionNode = node('ChipRevision', (record: ChipRevisionRecord) => revisionView(record));
export const configurationNode = node('Configuration', (record: ConfigurationRecord) =>
  configurationView(record),
);
export const versionNode = node('ConfigurationVersion', (record: VersionRecord) => versionView(record));
export const releaseNode = node('Release', (record: ReleaseRecord) => releaseView(record));
export const designNode = node('Design', (record: DesignRecord) => designView(record));
export const requestNode = node('DesignRequest', (record: DesignRequest) => requestView(record));
export const tokenNode = node('Token', (record: TokenRecord) => tokenView(record));
export const historyNode = node('HistoryEntry', (record: HistoryRecord) => historyView(record));

/** Any of them, as `node` finds it. */
export function anyNode(found: NodeRecord): object {
  switch (found.type) {
    case 'Actor':
      return actorNode(found.record);
    case 'Chip':
      return chipNode(found.record);
    case 'ChipRevision':
      return revisionNode(found.record);
    case 'Configuration':
      return configurationNode(found.record);
    case 'ConfigurationVersion':
      return versionNode(found.record);
    case 'Design':
      return designNode(found.record);
    case 'DesignRequest':
      return requestNode(found.record);
    case 'HistoryEntry':
      return historyNode(found.record);
    case 'Release':
      return releaseNode(found.record);
    case 'Token':
      return tokenNode(found.record);
  }
}

/** A page of records as a page of nodes. */
export async function connection<R, N>(page: Promise<Connection<R>>, nodeOf: (record: R) => N) {
  const { edges, pageInfo } = await page;
  return { pageInfo, edges: edges.map(({ cursor, node: record }) => ({ cursor, node: nodeOf(record) })) };
}

/** What several types have: who made it, and the chip it belongs to. */
export async function createdBy(
  parent: { record: { createdBy: string } },
  _: unknown,
  { load }: GraphqlContext,
) {
  const { createdBy: id } = parent.record;
  return actorNode(present(await load.actor(id), `actor ${id}`));
}

export async function createdByOrNull(
  parent: { record: { createdBy: string | null } },
  _: unknown,
  { load }: GraphqlContext,
) {
  const { createdBy: id } = parent.record;
  const actor = id === null ? null : await load.actor(id);
  return actor && actorNode(actor);
}

export async function chip(parent: { record: { chipId: string } }, _: unknown, { load }: GraphqlContext) {
  const { chipId } = parent.record;
  return chipNode(present(await load.chip(chipId), `chip ${chipId}`));
}

export async function chipRevision(
  parent: { record: { chipRevisionId: string } },
  _: unknown,
  { load }: GraphqlContext,
) {
  const { chipRevisionId } = parent.record;
  return revisionNode(present(await load.revision(chipRevisionId), `chip revision ${chipRevisionId}`));
}
