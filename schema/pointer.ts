/** JSON Pointer (RFC 6901) on plain JSON values: making, reading, and changing copies. */

export function pointerOf(path: readonly PropertyKey[]): string {
  return path.map((part) => `/${String(part).replaceAll('~', '~0').replaceAll('/', '~1')}`).join('');
}

export function partsOf(pointer: string): string[] {
  if (pointer === '') return [];
  return pointer
    .slice(1)
    .split('/')
    .map((part) => part.replaceAll('~1', '/').replaceAll('~0', '~'));
}

function isContainer(value: unknown): value is Record<string, unknown> {
  return typeof value === 'object' && value !== null;
}

/** The value at a path; undefined where nothing is. */
export function valueAt(root: unknown, path: readonly PropertyKey[]): unknown {
  let at = root;
  for (const part of path) {
    if (!isContainer(at) || !Object.hasOwn(at, part)) return undefined;
    at = at[part as string];
  }
  return at;
}

export interface Edit {
  readonly pointer: string;
  /** null: remove the member. */
  readonly works: unknown;
}

/** Changes first, then removals, from the end of lists so that the positions before stay what the pointers mean. */
function inOrder(edits: readonly Edit[]): Edit[] {
  const removals = edits.filter((edit) => edit.works === null);
  const indexOf = (edit: Edit) => Number(partsOf(edit.pointer).at(-1)) || 0;
  removals.sort((a, b) => indexOf(b) - indexOf(a));
  return [...edits.filter((edit) => edit.works !== null), ...removals];
}

/** A deep copy of `root` with the edits made. Missing objects on the way are created. */
export function withEdits(root: unknown, edits: readonly Edit[]): unknown {
  const copy = structuredClone(root);
  for (const { pointer, works } of inOrder(edits)) {
    const parts = partsOf(pointer);
    const last = parts.pop();
    if (last === undefined) continue;
    let at = copy;
    for (const part of parts) {
      if (!isContainer(at)) break;
      if (!Object.hasOwn(at, part)) at[part] = {};
      at = at[part];
    }
    if (!isContainer(at)) continue;
    if (works === null) removeMember(at, last);
    else at[last] = works;
  }
  return copy;
}

function removeMember(container: Record<string, unknown>, name: string): void {
  if (Array.isArray(container)) container.splice(Number(name), 1);
  else delete container[name];
}
