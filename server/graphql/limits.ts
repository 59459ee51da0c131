/** What an operation may measure. */
import type { DocumentNode, GraphQLSchema, OperationDefinitionNode } from 'graphql';
import type { Limits } from '../../schema/limits.ts';
import { type ProblemError, refuse } from '../errors.ts';
import { countRootFields, measure, type Variables } from './measure.ts';

/** What has no end has no number in JSON. */
const shown = (value: number): number | string => (Number.isFinite(value) ? Math.ceil(value) : 'without end');

export function tooExpensive(given: number, max: number, unit: string): ProblemError {
  const detail = `The operation comes to ${shown(given)} ${unit}; it may have ${max}.`;
  return refuse('QUERY_TOO_EXPENSIVE', detail, { given: shown(given), allowed: { max, unit } });
}

export function tooDeep(given: number, max: number): ProblemError {
  const nests = Number.isFinite(given)
    ? `nests ${given} levels of fields`
    : 'nests fields without end: its fragments hold each other';
  const detail = `The operation ${nests}; it may nest ${max}.`;
  return refuse('QUERY_TOO_DEEP', detail, { given: shown(given), allowed: { max, unit: 'levels' } });
}

/** @throws ProblemError QUERY_TOO_DEEP, QUERY_TOO_EXPENSIVE */
export function checkLimits(
  schema: GraphQLSchema,
  document: DocumentNode,
  operation: OperationDefinitionNode,
  variables: Variables,
  limits: Limits,
): void {
  const { depth, aliases, cost, points } = measure(schema, document, operation, variables);
  if (depth > limits.queryDepth) throw tooDeep(depth, limits.queryDepth);
  const names = aliases + countRootFields(document, operation);
  if (names > limits.aliases) throw tooExpensive(names, limits.aliases, 'aliases and root fields');
  if (points > limits.operationPoints) throw tooExpensive(points, limits.operationPoints, 'points of curves');
  if (cost > limits.queryCost) throw tooExpensive(cost, limits.queryCost, 'units of cost');
}
