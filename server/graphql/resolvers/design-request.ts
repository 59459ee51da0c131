/** DesignRequest. */
import type { DesignRequest as Asked } from '../../operations/index.ts';
import type { GraphqlContext } from '../context.ts';
import { chip, chipRevision, createdByOrNull, designNode } from './nodes.ts';
import type { TypeResolvers } from './resolve.ts';

export const DesignRequest: TypeResolvers = {
  chip,
  chipRevision,
  createdBy: createdByOrNull,
  async design({ record }: { record: Asked }, _: unknown, { load }: GraphqlContext) {
    if (record.designId === null) return null;
    const design = record.design ?? (await load.design(record.designId));
    return design && designNode(design);
  },
};
