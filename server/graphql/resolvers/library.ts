/** Configuration, ConfigurationVersion, Release. */
import type { ConfigurationRecord, ReleaseRecord, VersionRecord } from '../../store/records.ts';
import type { GraphqlContext } from '../context.ts';
import {
  chip,
  chipRevision,
  configurationNode,
  connection,
  createdBy,
  designNode,
  releaseNode,
  versionNode,
} from './nodes.ts';
import { type PageArgs, present, type TypeResolvers } from './resolve.ts';

interface Line {
  readonly record: ConfigurationRecord;
}

interface Version {
  readonly record: VersionRecord;
}

export const Configuration: TypeResolvers = {
  chip,
  createdBy,
  async latest({ record }: Line, _: unknown, { load }: GraphqlContext) {
    const found = await load.latestVersion(record.id);
    return found && versionNode(found);
  },
  async version({ record }: Line, { number }: { number: number }, { operations, viewer }: GraphqlContext) {
    const found = await operations.findVersion(viewer, record, number);
    return found && versionNode(found);
  },
  versions({ record }: Line, args: PageArgs, { operations, viewer }: GraphqlContext) {
    return connection(operations.listVersions(viewer, record, args), versionNode);
  },
};

export const ConfigurationVersion: TypeResolvers = {
  chipRevision,
  createdBy,
  async configuration({ record }: Version, _: unknown, { load }: GraphqlContext) {
    const id = record.configurationId;
    return configurationNode(present(await load.configuration(id), `configuration ${id}`));
  },
  async source({ record }: Version, _: unknown, { load }: GraphqlContext) {
    const design = await load.design(record.designId);
    return design && designNode(design);
  },
  async releases({ record }: Version, _: unknown, { load }: GraphqlContext) {
    return ((await load.releasesOfVersion(record.id)) ?? []).map(releaseNode);
  },
};

export const Release: TypeResolvers = {
  chip,
  createdBy,
  version: ({ record }: { record: ReleaseRecord }) => versionNode(record.version),
};
