/** Token, HistoryEntry. */
import { designId, releaseId, wireId } from '../../operations/index.ts';
import type { HistoryRecord, TokenRecord } from '../../store/records.ts';
import type { GraphqlContext } from '../context.ts';
import { actorNode, anyNode, chipNode, createdByOrNull, designNode, revisionNode } from './nodes.ts';
import type { TypeResolvers } from './resolve.ts';

export const Token: TypeResolvers = {
  actor: ({ record }: { record: TokenRecord }) => actorNode(record.actor),
  createdBy: createdByOrNull,
};

/** Wire id of what an entry is about; null for kinds that have none. */
function subjectIdOf({ subjectKind, subjectId }: HistoryRecord): string | null {
  switch (subjectKind) {
    case 'Token':
      return wireId('tok', subjectId);
    case 'Chip':
      return wireId('chp', subjectId);
    case 'ChipRevision':
      return wireId('rev', subjectId);
    case 'DesignRequest':
      return wireId('req', subjectId);
    case 'Design':
      return designId(subjectId);
    case 'ConfigurationVersion':
      return wireId('ver', subjectId);
    case 'Release': {
      const [chipId = '', name = '', sequence] = subjectId.split('/');
      return releaseId({ chipId, name, sequence: Number(sequence) });
    }
    default:
      return null;
  }
}

export const HistoryEntry: TypeResolvers = {
  actor: ({ record }: { record: HistoryRecord }) => actorNode(record.actor),
  async chip({ record }: { record: HistoryRecord }, _: unknown, { load }: GraphqlContext) {
    const chip = record.chipId === null ? null : await load.chip(record.chipId);
    return chip && chipNode(chip);
  },
  async subject({ record }: { record: HistoryRecord }, _: unknown, context: GraphqlContext) {
    const { load, operations, viewer } = context;
    // The kinds that a page of the history is full of come together, the rest one by one.
    if (record.subjectKind === 'Chip') {
      const chip = await load.chip(record.subjectId);
      return chip && chipNode(chip);
    }
    if (record.subjectKind === 'ChipRevision') {
      const revision = await load.revision(record.subjectId);
      return revision && revisionNode(revision);
    }
    if (record.subjectKind === 'Design') {
      const design = await load.design(record.subjectId);
      return design && designNode(design);
    }
    const id = subjectIdOf(record);
    const found = id === null ? null : await operations.node(viewer, id);
    return found && anyNode(found);
  },
};
