/** Where in its argument a value of a document stands: the same pointers as everywhere, relative to `input`. */
import { type ASTNode, type DocumentNode, Kind, type ValueNode, visit } from 'graphql';

type Path = readonly (string | number)[];

export interface Places {
  /** Null: the node is no value of an argument. */
  ofNode(node: ASTNode): Path | null;
  /** Where the variable is used first; its own name when it is not. */
  ofVariable(name: string): Path;
}

/** The argument `input` is the request body of REST; other arguments are members beside each other. */
const ROOT_ARGUMENT = 'input';

export function placesOf(document: DocumentNode): Places {
  const places = new Map<ASTNode, Path>();
  const variables = new Map<string, Path>();

  function walk(value: ValueNode, path: Path): void {
    places.set(value, path);
    if (value.kind === Kind.VARIABLE && !variables.has(value.name.value))
      variables.set(value.name.value, path);
    if (value.kind === Kind.LIST) {
      for (const [index, entry] of value.values.entries()) walk(entry, [...path, index]);
    }
    if (value.kind === Kind.OBJECT) {
      for (const field of value.fields) {
        const inner = [...path, field.name.value];
        places.set(field, inner);
        walk(field.value, inner);
      }
    }
  }

  visit(document, {
    Argument(node) {
      const name = node.name.value;
      walk(node.value, name === ROOT_ARGUMENT ? [] : [name]);
      return false;
    },
  });
  return {
    ofNode: (node) => places.get(node) ?? null,
    ofVariable: (name) => variables.get(name) ?? [name],
  };
}
