/** `@access(roles: [...])` of the schema, enforced in front of the resolver. */
import {
  type GraphQLField,
  type GraphQLObjectType,
  type GraphQLSchema,
  getDirectiveValues,
  isObjectType,
} from 'graphql';
import { forbidden } from '../errors.ts';
import type { Role } from '../store/records.ts';
import type { GraphqlContext } from './context.ts';

/** Null: the field has no rule of its own; whoever may see its object may see it. */
function rolesOf(schema: GraphQLSchema, field: GraphQLField<unknown, unknown>): readonly Role[] | null {
  const directive = schema.getDirective('access');
  if (!directive || !field.astNode) return null;
  const values = getDirectiveValues(directive, field.astNode);
  return values === undefined ? null : (values.roles as readonly Role[]);
}

/** The same function, for nobody but these roles. A refusal is the promise's, like every other. */
function guard<A extends unknown[], R>(
  roles: readonly Role[],
  label: string,
  ask: (parent: unknown, args: unknown, context: GraphqlContext, ...rest: A) => R,
) {
  return (parent: unknown, args: unknown, context: GraphqlContext, ...rest: A): R => {
    const { role } = context.viewer;
    if (!roles.includes(role)) throw forbidden(`ask for ${label}`, role, roles);
    return ask(parent, args, context, ...rest);
  };
}

function rootTypes(schema: GraphQLSchema): GraphQLObjectType[] {
  return [schema.getQueryType(), schema.getMutationType(), schema.getSubscriptionType()].filter(
    (type) => !!type,
  );
}

/**
 * Puts the rules in front of the resolvers, which must be there already.
 * @throws Error when a root field has no rule: nothing is open by oversight
 */
export function enforceAccess(schema: GraphQLSchema): void {
  const roots = rootTypes(schema);
  for (const type of Object.values(schema.getTypeMap())) {
    if (!isObjectType(type) || type.name.startsWith('__')) continue;
    for (const field of Object.values(type.getFields())) {
      const label = `${type.name}.${field.name}`;
      const roles = rolesOf(schema, field);
      if (roles === null) {
        if (roots.includes(type)) throw new Error(`No @access rule for ${label}.`);
        continue;
      }
      const { resolve, subscribe } = field;
      if (!resolve) throw new Error(`${label} has an @access rule and no resolver to stand in front of.`);
      field.resolve = guard(roles, label, resolve);
      if (subscribe) field.subscribe = guard(roles, label, subscribe);
    }
  }
}
