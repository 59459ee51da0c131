/** FilterSpecification, SpecificationCheck. */
import type { SpecificationCheck as Check } from '../../operations/index.ts';
import { type FilterSpecificationView, specificationView } from '../../views/index.ts';
import type { GraphqlContext } from '../context.ts';
import type { TypeResolvers } from './resolve.ts';

export function specificationNode(view: FilterSpecificationView) {
  return { __typename: 'bands' in view ? 'MaskSpecification' : 'FamilySpecification', ...view };
}

export const SpecificationCheck: TypeResolvers = {
  specification({ specification, revision }: Check, _: unknown, { operations }: GraphqlContext) {
    if (specification === null || revision === null) return null;
    return specificationNode(specificationView(specification, operations.modelOf(revision)));
  },
};
