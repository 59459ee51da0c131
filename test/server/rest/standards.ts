/** The standards' own examples, `test/reference/rest-standards.json`; each entry there names its document. */
import { readFileSync } from 'node:fs';

interface Point {
  readonly section: string;
  readonly rule: string;
  readonly test: unknown;
}

const file = JSON.parse(
  readFileSync(new URL('../../reference/rest-standards.json', import.meta.url), 'utf8'),
) as {
  entries: { id: string; points: Point[] }[];
};

/** The test data of one numbered section; fails when the reference lost it. */
export function standardExample<T>(id: string, section: string, rule?: RegExp): T {
  const points = file.entries.find((entry) => entry.id === id)?.points ?? [];
  const point = points.find((p) => p.section === section && p.test && (!rule || rule.test(p.rule)));
  if (!point) throw new Error(`no example for ${id} ${section}`);
  return point.test as T;
}
