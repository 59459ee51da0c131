/** Reading pictures back: enough of SVG for what the plots contain. */

/** Every `<…>` closes in order and every attribute is quoted; throws where not. */
export function assertWellFormed(svg: string): void {
  const open: string[] = [];
  for (const [, closing, name, attributes, alone] of svg.matchAll(
    /<(\/?)([A-Za-z][\w:-]*)((?:\s+[\w:-]+="[^"<]*")*)\s*(\/?)>/g,
  )) {
    if (closing) {
      if (open.pop() !== name) throw new Error(`</${name}> closes something else`);
    } else if (!alone) open.push(name!);
    void attributes;
  }
  if (open.length > 0) throw new Error(`${open.join(', ')} left open`);
  const rest = svg
    .replace(/<\?xml[^?]*\?>/, '')
    .replace(/<(\/?)([A-Za-z][\w:-]*)((?:\s+[\w:-]+="[^"<]*")*)\s*(\/?)>/g, '');
  if (rest.includes('<')) throw new Error('something that is no element');
}

export function attribute(element: string, name: string): string {
  const found = new RegExp(` ${name}="([^"]*)"`).exec(element)?.[1];
  if (found === undefined) throw new Error(`no ${name} in ${element.slice(0, 120)}`);
  return found;
}

/** The elements of one mark role and kind, as text. */
export function marks(svg: string, kind: string): string[] {
  return [...svg.matchAll(/<(path|line)[^>]*>/g)]
    .map(([element]) => element)
    .filter((element) => element.includes(`aria-roledescription="${kind}"`));
}

export interface PathPoint {
  readonly x: number;
  readonly y: number;
}

/** The runs of a path of straight pieces (M, L, H, V, h, v, absolute but for the small letters). */
export function runsOf(path: string): PathPoint[][] {
  const runs: PathPoint[][] = [];
  let x = 0;
  let y = 0;
  for (const [, command, numbers] of path.matchAll(/([MLHVhvZ])([^MLHVhvZ]*)/g)) {
    const [first = 0, second = 0] = (numbers!.match(/-?[\d.]+(?:e-?\d+)?/g) ?? []).map(Number);
    if (command === 'M' || command === 'L') [x, y] = [first, second];
    else if (command === 'H') x = first;
    else if (command === 'V') y = first;
    else if (command === 'h') x += first;
    else if (command === 'v') y += first;
    else continue;
    if (command === 'M') runs.push([]);
    runs.at(-1)!.push({ x, y });
  }
  return runs;
}

export function translation(element: string): PathPoint {
  const [x = 0, y = 0] = (/translate\(([^)]*)\)/.exec(element)?.[1] ?? '').split(',').map(Number);
  return { x, y };
}
