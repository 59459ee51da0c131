/** Puts the operations together. */
import { LIMITS } from '../../schema/limits.ts';
import { chipOperations } from './chips.ts';
import { configurationOperations } from './configurations.ts';
import { createContext, type OperationsDeps } from './context.ts';
import { designOperations } from './designs.ts';
import { edgeOperations } from './edges.ts';
import { manyEdgeOperations } from './many-edges.ts';
import { nodeFinders } from './nodes.ts';
import type { Operations } from './operations.ts';
import { peopleOperations } from './people.ts';
import { releaseOperations } from './releases.ts';
import { requestOperations } from './requests.ts';

export function createOperations(deps: OperationsDeps): Operations {
  const limits = { ...LIMITS, ...deps.limits };
  const context = createContext(deps, limits);
  const operations = {
    limits,
    ...chipOperations(context),
    ...requestOperations(context),
    ...designOperations(context),
    ...configurationOperations(context),
    ...releaseOperations(context),
    ...peopleOperations(context),
    ...edgeOperations(context),
    ...manyEdgeOperations(context),
  };
  const finders = nodeFinders(context, operations);
  return {
    ...operations,
    async node(viewer, id) {
      return finders[id.slice(0, 3)]?.(viewer, id) ?? null;
    },
  };
}
