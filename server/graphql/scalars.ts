/** Custom scalars. What a value may be is decided by the zod rules; these only carry it. */
import { GraphQLError, type GraphQLScalarType, valueFromASTUntyped } from 'graphql';

type Scalar = Pick<GraphQLScalarType, 'serialize' | 'parseValue' | 'parseLiteral'>;

function text(value: unknown): string {
  if (typeof value === 'string') return value;
  throw new GraphQLError('DateTime must be a string: an RFC 3339 time with a zone.');
}

export const SCALARS: Readonly<Record<string, Scalar>> = {
  DateTime: {
    serialize: text,
    parseValue: text,
    parseLiteral: (node) => text(valueFromASTUntyped(node)),
  },
  JSON: {
    serialize: (value) => value,
    parseValue: (value) => value,
    parseLiteral: (node, variables) => valueFromASTUntyped(node, variables),
  },
};
