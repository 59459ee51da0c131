/** Values of variables against their types, with pointers; graphql's own check names places in prose. */
import {
  coerceInputValue,
  type DocumentNode,
  type GraphQLSchema,
  isInputType,
  isNonNullType,
  type OperationDefinitionNode,
  typeFromAST,
} from 'graphql';
import { pointerOf } from '../../schema/pointer.ts';
import type { FieldProblem } from '../../schema/problem.ts';
import { jsonSafe } from '../problem-of-zod.ts';
import type { Variables } from './measure.ts';
import { placesOf } from './pointers.ts';

/** More are not told: whoever sent them has something else in mind. */
const MOST_ERRORS = 50;

/** Empty: everything fits. The document must have been validated. */
export function coercionFaults(
  schema: GraphQLSchema,
  document: DocumentNode,
  { variableDefinitions }: OperationDefinitionNode,
  variables: Variables,
): readonly FieldProblem[] {
  const faults: FieldProblem[] = [];
  const fault = (name: string, path: readonly (string | number)[], what: string, given: unknown): void => {
    if (faults.length >= MOST_ERRORS) return;
    const pointer = pointerOf([...placesOf(document).ofVariable(name), ...path]);
    const value = given === undefined ? {} : { given: jsonSafe(given) };
    faults.push({ code: 'BAD_INPUT', pointer, detail: `${pointer || 'The input'}: ${what}`, ...value });
  };
  for (const { variable, type: typeNode, defaultValue } of variableDefinitions ?? []) {
    const name = variable.name.value;
    const type = typeFromAST(schema, typeNode);
    const given = variables[name];
    if (!isInputType(type)) continue;
    if (given === undefined || given === null) {
      const isMissing = isNonNullType(type) && (given === null || !defaultValue);
      if (isMissing)
        fault(
          name,
          [],
          `the variable $${name} of type ${type} is ${given === null ? 'null' : 'missing'}.`,
          given,
        );
      continue;
    }
    coerceInputValue(given, type, (path, invalid, error) => fault(name, path, error.message, invalid));
  }
  return faults;
}
