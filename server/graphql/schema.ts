/** The executable schema: what is written, with a resolver behind everything that is not a plain member. */
import {
  buildSchema,
  type GraphQLFieldResolver,
  type GraphQLSchema,
  isAbstractType,
  isObjectType,
  isScalarType,
} from 'graphql';
import { enforceAccess } from './access.ts';
import type { GraphqlContext } from './context.ts';
import { RESOLVERS, type TypeResolvers } from './resolvers/index.ts';
import { SCALARS } from './scalars.ts';
import { readSdl } from './sdl.ts';

type AnyResolve = GraphQLFieldResolver<unknown, GraphqlContext>;

function attach(schema: GraphQLSchema, typeName: string, resolvers: TypeResolvers): void {
  const type = schema.getType(typeName);
  if (!isObjectType(type)) throw new Error(`There are resolvers for ${typeName}, which is no object type.`);
  const fields = type.getFields();
  for (const [name, resolver] of Object.entries(resolvers)) {
    const field = fields[name];
    if (!field) throw new Error(`There is a resolver for ${typeName}.${name}, which is not in the schema.`);
    if (typeof resolver === 'function') {
      field.resolve = resolver as AnyResolve;
    } else {
      field.subscribe = resolver.subscribe as AnyResolve;
      field.resolve = resolver.resolve as AnyResolve;
    }
  }
}

function requireRootResolvers(schema: GraphQLSchema): void {
  for (const type of [schema.getQueryType(), schema.getMutationType(), schema.getSubscriptionType()]) {
    for (const field of Object.values(type?.getFields() ?? {})) {
      if (!field.resolve) throw new Error(`There is no resolver for ${type?.name}.${field.name}.`);
    }
  }
}

/**
 * @param sdl as it is written, unless a test has another
 * @throws Error when schema, resolvers and access rules do not fit together: the process must not start
 */
export function createSchema(sdl: string = readSdl()): GraphQLSchema {
  const schema = buildSchema(sdl);
  for (const [typeName, resolvers] of Object.entries(RESOLVERS)) attach(schema, typeName, resolvers);
  for (const type of Object.values(schema.getTypeMap())) {
    if (isScalarType(type)) Object.assign(type, SCALARS[type.name] ?? {});
    // Every node says what it is (resolvers/nodes.ts).
    if (isAbstractType(type)) type.resolveType = (value) => (value as { __typename: string }).__typename;
  }
  requireRootResolvers(schema);
  enforceAccess(schema);
  return schema;
}
