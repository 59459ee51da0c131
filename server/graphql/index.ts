/** GraphQL. */
export { type GraphqlDeps, registerGraphql } from './register.ts';
