/** Chip, ChipRevision, ChipModel. */
import { DEFAULT_RELEASE } from '../../../schema/library.ts';
import type { ChipRecord, ChipRevisionRecord } from '../../store/records.ts';
import { chipModelView } from '../../views/index.ts';
import type { GraphqlContext } from '../context.ts';
import {
  chip,
  configurationNode,
  connection,
  createdBy,
  historyNode,
  releaseNode,
  revisionNode,
} from './nodes.ts';
import { type PageArgs, present, type TypeResolvers } from './resolve.ts';

interface Parent {
  readonly record: ChipRecord;
}

export const Chip: TypeResolvers = {
  createdBy,
  async head({ record }: Parent, _: unknown, { load }: GraphqlContext) {
    return revisionNode(present(await load.headRevision(record.id), `head revision of chip ${record.id}`));
  },
  async revision({ record }: Parent, { number }: { number: number }, { operations, viewer }: GraphqlContext) {
    const found = await operations.findRevision(viewer, record, number);
    return found && revisionNode(found);
  },
  revisions({ record }: Parent, args: PageArgs, { operations, viewer }: GraphqlContext) {
    return connection(operations.listRevisions(viewer, record, args), revisionNode);
  },
  async configuration(
    { record }: Parent,
    { name }: { name: string },
    { operations, viewer }: GraphqlContext,
  ) {
    const found = await operations.findConfiguration(viewer, record, name);
    return found && configurationNode(found);
  },
  configurations({ record }: Parent, args: PageArgs, { operations, viewer }: GraphqlContext) {
    return connection(operations.listConfigurations(viewer, record, args), configurationNode);
  },
  async release({ record }: Parent, args: { name?: string | null }, { load }: GraphqlContext) {
    const name = args.name ?? DEFAULT_RELEASE;
    const found = (await load.releasesOfChip(record.id))?.find((release) => release.name === name);
    return found ? releaseNode(found) : null;
  },
  async releases({ record }: Parent, _: unknown, { load }: GraphqlContext) {
    return ((await load.releasesOfChip(record.id)) ?? []).map(releaseNode);
  },
  history({ record }: Parent, args: PageArgs, { operations, viewer }: GraphqlContext) {
    const ask = { ...args, filter: { chip: record.serial } };
    return connection(operations.listHistory(viewer, ask), historyNode);
  },
};

export const ChipRevision: TypeResolvers = {
  chip,
  createdBy,
  model({ record }: { record: ChipRevisionRecord }, _: unknown, { operations }: GraphqlContext) {
    const model = chipModelView(operations.modelOf(record), record.model);
    return {
      ...model,
      cells: model.cells.map((cell) => ({ __typename: 'InterferometerCell', ...cell })),
    };
  },
};
