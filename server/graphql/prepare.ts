/**
 * From the text of a request to an operation that may be run: size, syntax, limits, validation, variables, in the order
 * in which each protects the next. Documents are kept with the result of their validation: programs send the same few.
 */
import {
  type DocumentNode,
  GraphQLError,
  type GraphQLSchema,
  getOperationAST,
  Kind,
  type OperationDefinitionNode,
  parse,
  print,
  separateOperations,
  validate,
} from 'graphql';
import type { Limits } from '../../schema/limits.ts';
import { badInput, refuse } from '../errors.ts';
import { coercionFaults } from './coercion.ts';
import { bodyOfDocumentError, bodyOfFields, RequestRefused } from './error-body.ts';
import { checkLimits, tooDeep, tooExpensive } from './limits.ts';
import { countFields, type Variables } from './measure.ts';
import { placesOf } from './pointers.ts';

export interface GraphqlRequest {
  readonly query: string;
  readonly operationName: string | null;
  readonly variables: Variables;
}

export interface Prepared {
  readonly document: DocumentNode;
  readonly operation: OperationDefinitionNode;
  readonly variables: Variables;
  /**
   * What to hand to the executor: with several operations in the document, the one alone. Its compiled form is kept by
   * the text, so one text must mean one operation.
   */
  readonly source: string;
}

/**
 * Fields written in one document. Validation compares the fields of one place with each other, pair by pair, also in
 * fragments that nothing uses; the whole schema has fewer fields than this.
 */
const MOST_FIELDS = 1_000;

/** Documents kept; each may take a megabyte as a tree. */
const KEPT_DOCUMENTS = 200;

interface Known {
  readonly document: DocumentNode;
  /** Null: not validated yet. */
  faults: RequestRefused | 'NONE' | null;
  readonly sources: Map<string, string>;
}

function parseDocument(query: string, limits: Limits): DocumentNode {
  try {
    return parse(query);
  } catch (error) {
    if (error instanceof GraphQLError) throw new RequestRefused([bodyOfDocumentError(error, null)], true);
    // The parser calls itself for every level: this document has thousands.
    if (error instanceof RangeError) throw tooDeep(Number.POSITIVE_INFINITY, limits.queryDepth);
    throw error;
  }
}

function selectOperation(document: DocumentNode, operationName: string | null): OperationDefinitionNode {
  const operation = getOperationAST(document, operationName);
  if (operation) return operation;
  const names = document.definitions.flatMap((one) =>
    one.kind === Kind.OPERATION_DEFINITION ? [one.name?.value ?? ''] : [],
  );
  const detail =
    operationName === null
      ? 'The document does not hold exactly one operation: operationName must name one.'
      : `The document has no operation ${operationName.slice(0, 100)}.`;
  throw badInput(detail, { given: operationName, allowed: names });
}

/** The text of the operation and the fragments it uses, and nothing else. */
function sourceOf(query: string, { document, sources }: Known, { name }: OperationDefinitionNode): string {
  const operations = document.definitions.filter((one) => one.kind === Kind.OPERATION_DEFINITION);
  if (operations.length === 1) return query;
  const key = name?.value ?? '';
  const before = sources.get(key);
  if (before !== undefined) return before;
  const source = print(separateOperations(document)[key] ?? document);
  sources.set(key, source);
  return source;
}

export type Prepare = (request: GraphqlRequest) => Prepared;

/** The result throws ProblemError or RequestRefused. */
export function createPrepare(schema: GraphQLSchema, limits: Limits): Prepare {
  const kept = new Map<string, Known>();

  function know(query: string): Known {
    const before = kept.get(query);
    if (before) return before;
    const document = parseDocument(query, limits);
    const fields = countFields(document);
    if (fields > MOST_FIELDS) throw tooExpensive(fields, MOST_FIELDS, 'fields in its document');
    const known: Known = { document, faults: null, sources: new Map() };
    if (kept.size >= KEPT_DOCUMENTS) kept.delete(kept.keys().next().value ?? '');
    kept.set(query, known);
    return known;
  }

  function validated(known: Known): void {
    if (known.faults === null) {
      const errors = validate(schema, known.document);
      const places = errors.length > 0 ? placesOf(known.document) : null;
      const bodies = errors.map((error) => bodyOfDocumentError(error, places));
      known.faults = bodies.length > 0 ? new RequestRefused(bodies, true) : 'NONE';
    }
    if (known.faults !== 'NONE') throw known.faults;
  }

  return ({ query, operationName, variables }) => {
    const bytes = Buffer.byteLength(query);
    if (bytes > limits.documentBytes) {
      const detail = `The document has ${bytes} bytes; it may have ${limits.documentBytes}.`;
      const allowed = { max: limits.documentBytes, unit: 'byte' };
      throw refuse('TOO_LARGE', detail, { pointer: '/query', given: bytes, allowed });
    }
    const known = know(query);
    const { document } = known;
    for (const one of document.definitions) {
      // All of them are validated, so all of them are measured.
      if (one.kind === Kind.OPERATION_DEFINITION) checkLimits(schema, document, one, variables, limits);
    }
    validated(known);
    const operation = selectOperation(document, operationName);
    const faults = coercionFaults(schema, document, operation, variables);
    if (faults.length > 0) throw new RequestRefused([bodyOfFields(faults)], true);
    return { document, operation, variables, source: sourceOf(query, known, operation) };
  };
}

/** Whether an operation asks about the schema and nothing else. */
export function isIntrospection({ operation }: Prepared): boolean {
  return operation.selectionSet.selections.every(
    (selection) => selection.kind === Kind.FIELD && selection.name.value.startsWith('__'),
  );
}
