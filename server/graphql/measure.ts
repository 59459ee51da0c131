/**
 * How large an operation is, before anything of it is checked or run: nesting, aliases, cost, points of its curves.
 * Works on documents that were only parsed: unknown fields count like any other, a fragment that contains itself is
 * endless. Each fragment is measured once, so the work is linear in the document however often fragments are spread.
 */
import {
  type ArgumentNode,
  type DocumentNode,
  type FieldNode,
  type GraphQLField,
  type GraphQLNamedType,
  type GraphQLSchema,
  getNamedType,
  getNullableType,
  isCompositeType,
  isInterfaceType,
  isListType,
  isObjectType,
  Kind,
  type OperationDefinitionNode,
  type SelectionSetNode,
  type ValueNode,
  valueFromASTUntyped,
  visit,
} from 'graphql';
import { LIMITS } from '../../schema/limits.ts';

export interface Measure {
  readonly depth: number;
  /** Aliases below the roots. */
  readonly aliases: number;
  readonly cost: number;
  /** Points of all curves together, before they are reduced. */
  readonly points: number;
}

/** Entries that a list without `first` is taken to have: cells, channels, bands, releases. */
const ASSUMED_ENTRIES = 10;
/** Points of a curve without a grid (`Design.response`). */
const DEFAULT_POINTS = 2001;
const CURVE_COST = 20;
const POINTS_PER_COST = 100;
const FIGURES_COST = 20;

const NOTHING: Measure = { depth: 0, aliases: 0, cost: 0, points: 0 };
const ENDLESS: Measure = {
  depth: Number.POSITIVE_INFINITY,
  aliases: Number.POSITIVE_INFINITY,
  cost: Number.POSITIVE_INFINITY,
  points: Number.POSITIVE_INFINITY,
};

const beside = (a: Measure, b: Measure): Measure => ({
  depth: Math.max(a.depth, b.depth),
  aliases: a.aliases + b.aliases,
  cost: a.cost + b.cost,
  points: a.points + b.points,
});

/** `0 × ∞` would be NaN, which no comparison catches. */
const times = (count: number, value: number): number => (count === 0 ? 0 : count * value);

export type Variables = Readonly<Record<string, unknown>>;

interface Scope {
  readonly schema: GraphQLSchema;
  readonly document: DocumentNode;
  readonly variables: Variables;
  /** By fragment and the page size around it; null while it is being measured. */
  readonly fragments: Map<string, Measure | null>;
}

/** The variables as the operation sees them, defaults included. */
function withDefaults({ variableDefinitions }: OperationDefinitionNode, given: Variables): Variables {
  const defaults = (variableDefinitions ?? []).flatMap(({ variable, defaultValue }) =>
    defaultValue ? [[variable.name.value, valueFromASTUntyped(defaultValue)] as const] : [],
  );
  return { ...Object.fromEntries(defaults), ...given };
}

function plainValue(node: ValueNode | undefined, variables: Variables): unknown {
  return node === undefined ? undefined : valueFromASTUntyped(node, variables as Record<string, unknown>);
}

function argument(field: FieldNode, name: string, { variables }: Scope): unknown {
  return plainValue(field.arguments?.find((one: ArgumentNode) => one.name.value === name)?.value, variables);
}

/** What is no size is refused later; here it counts like an absent one. */
function pageSizeOf(field: FieldNode, scope: Scope): number {
  const first = argument(field, 'first', scope);
  if (typeof first !== 'number' || !(first >= 0)) return LIMITS.defaultPageSize;
  return Math.min(first, LIMITS.pageSize);
}

function pointsOf(field: FieldNode, scope: Scope): number {
  const grid = argument(field, 'grid', scope);
  if (typeof grid !== 'object' || grid === null) return DEFAULT_POINTS;
  const spans: unknown[] = Object.values(grid);
  const points = spans.map((span) =>
    typeof span === 'object' && span !== null ? Reflect.get(span, 'points') : 0,
  );
  return Math.max(0, ...points.filter((one): one is number => typeof one === 'number'));
}

function definitionOf(
  type: GraphQLNamedType | undefined,
  name: string,
): GraphQLField<unknown, unknown> | undefined {
  return isObjectType(type) || isInterfaceType(type) ? type.getFields()[name] : undefined;
}

function isList({ type }: GraphQLField<unknown, unknown>): boolean {
  return isListType(getNullableType(type));
}

/** How often the selections of a field are answered for one answer of the field's parent. */
function entriesOf(
  definition: GraphQLField<unknown, unknown> | undefined,
  parent: GraphQLNamedType | undefined,
  pageSize: number,
): number {
  if (!definition || !isList(definition) || !isCompositeType(getNamedType(definition.type))) return 1;
  return definition.name === 'edges' && parent?.name.endsWith('Connection') ? pageSize : ASSUMED_ENTRIES;
}

function measureField(
  field: FieldNode,
  parent: GraphQLNamedType | undefined,
  pageSize: number,
  scope: Scope,
): Measure {
  const name = field.name.value;
  const definition = definitionOf(parent, name);
  const type = definition && getNamedType(definition.type);
  const entries = entriesOf(definition, parent, pageSize);
  const inner = field.selectionSet
    ? measureSelections(field.selectionSet, type, pageSizeOf(field, scope), scope)
    : NOTHING;
  const points = type?.name === 'Response' ? pointsOf(field, scope) : 0;
  const curve = type?.name === 'Response' ? CURVE_COST + points / POINTS_PER_COST : 0;
  const figures = type?.name === 'Figures' ? FIGURES_COST : 0;
  const isIntrospection = name === '__schema' || name === '__type';
  return {
    depth: isIntrospection ? 1 : 1 + inner.depth,
    aliases: (field.alias ? 1 : 0) + inner.aliases,
    cost: 1 + curve + figures + times(entries, inner.cost),
    points: points + times(entries, inner.points),
  };
}

function measureFragment(name: string, pageSize: number, scope: Scope): Measure {
  const key = `${name} ${pageSize}`;
  const known = scope.fragments.get(key);
  if (known !== undefined) return known ?? ENDLESS;
  const definition = scope.document.definitions.find(
    (one) => one.kind === Kind.FRAGMENT_DEFINITION && one.name.value === name,
  );
  if (definition?.kind !== Kind.FRAGMENT_DEFINITION) return NOTHING;
  scope.fragments.set(key, null);
  const type = scope.schema.getType(definition.typeCondition.name.value);
  const measured = measureSelections(definition.selectionSet, type, pageSize, scope);
  scope.fragments.set(key, measured);
  return measured;
}

function measureSelections(
  { selections }: SelectionSetNode,
  parent: GraphQLNamedType | undefined,
  pageSize: number,
  scope: Scope,
): Measure {
  let sum = NOTHING;
  for (const selection of selections) {
    if (selection.kind === Kind.FIELD) {
      sum = beside(sum, measureField(selection, parent, pageSize, scope));
    } else if (selection.kind === Kind.FRAGMENT_SPREAD) {
      sum = beside(sum, measureFragment(selection.name.value, pageSize, scope));
    } else {
      const { typeCondition, selectionSet } = selection;
      const type = typeCondition ? scope.schema.getType(typeCondition.name.value) : parent;
      sum = beside(sum, measureSelections(selectionSet, type, pageSize, scope));
    }
  }
  return sum;
}

/** An upper bound: what `@skip` and `@include` leave out is counted, and every type of a union. */
export function measure(
  schema: GraphQLSchema,
  document: DocumentNode,
  operation: OperationDefinitionNode,
  given: Variables,
): Measure {
  const variables = withDefaults(operation, given);
  const scope: Scope = { schema, document, variables, fragments: new Map() };
  const root = schema.getRootType(operation.operation) ?? undefined;
  return measureSelections(operation.selectionSet, root, LIMITS.defaultPageSize, scope);
}

/** Root fields as they are answered, those of fragments included. */
export function countRootFields(document: DocumentNode, operation: OperationDefinitionNode): number {
  const seen = new Set<string>();
  const count = ({ selections }: SelectionSetNode): number =>
    selections.reduce((sum, selection) => {
      if (selection.kind === Kind.FIELD) return sum + 1;
      if (selection.kind === Kind.INLINE_FRAGMENT) return sum + count(selection.selectionSet);
      const name = selection.name.value;
      if (seen.has(name)) return sum;
      seen.add(name);
      const definition = document.definitions.find(
        (one) => one.kind === Kind.FRAGMENT_DEFINITION && one.name.value === name,
      );
      return definition?.kind === Kind.FRAGMENT_DEFINITION ? sum + count(definition.selectionSet) : sum;
    }, 0);
  return count(operation.selectionSet);
}

/** Fields as they are written, in operations and fragments, used or not. */
export function countFields(document: DocumentNode): number {
  let count = 0;
  visit(document, {
    Field() {
      count += 1;
    },
  });
  return count;
}
