/** Inputs that take exactly one of several members, the JSON twin of GraphQL's `@oneOf`. */
import { z } from 'zod';

/** The exact union a one-of rule yields: one member present, the others absent. */
export type OneOf<T> = {
  [K in keyof T]: { readonly [P in K]: T[P] } & { readonly [P in Exclude<keyof T, K>]?: undefined };
}[keyof T];

/** A strict object of which exactly one member must be given. */
export function oneOfRule<S extends Record<string, z.ZodType>>(members: S) {
  type Value = OneOf<{ [K in keyof S]: z.infer<S[K]> }>;
  const names = Object.keys(members);
  const shape = Object.fromEntries(names.map((name) => [name, members[name]!.optional()]));
  const rule = z
    .strictObject(shape)
    .meta({ minProperties: 1, maxProperties: 1 })
    .check((ctx) => {
      const given = names.filter((name) => ctx.value[name] !== undefined);
      if (given.length === 1) return;
      const found = given.length === 0 ? 'none is given' : `${given.join(' and ')} are given`;
      ctx.issues.push({
        code: 'custom',
        input: ctx.value,
        message: `must have exactly one of ${names.join(', ')}; ${found}`,
        params: { code: 'BAD_INPUT', allowed: { oneOf: names } },
      });
    });
  // The check above is what makes the narrower type true.
  return rule as unknown as z.ZodType<Value, Value>;
}
