/** What the documents say is what there is: the tour's commands run as written, tables equal the code, links lead somewhere. */
import { existsSync, readdirSync, readFileSync } from 'node:fs';
import { dirname, join, relative } from 'node:path';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { LIMITS } from '../schema/limits.ts';
import { CONFIGURATION } from '../server/config.ts';
import { PROBLEM_TABLE } from '../server/problem-table.ts';
import { missingAmong, notRun, ROOT, run, type StartedService, startService } from './examples/service.ts';

const read = (file: string): string => readFileSync(join(ROOT, file), 'utf8');
const README = read('README.md');
const DOCUMENTS = ['README.md', 'DEVELOPERS.md', 'CHANGELOG.md'];

/** The text under a heading of the second level. */
function section(title: string): string {
  const found = new RegExp(`^## ${title}$([\\s\\S]*?)(?=^## |$(?![\\s\\S]))`, 'm').exec(README);
  if (!found) throw new Error(`the README has no section "${title}"`);
  return found[1]!;
}

const shellBlocks = (text: string): string[] =>
  [...text.matchAll(/^```sh\n([\s\S]*?)^```$/gm)].map((found) => found[1]!);

/** Besides Node; what the tour says at its beginning. */
const missing = await missingAmong(['bash', 'curl', 'awk']);

describe.skipIf(missing.length > 0)(`the tour of the README${notRun(missing)}`, () => {
  const blocks = shellBlocks(section('Five-minute tour'));
  /** What each block must have printed: the facts that the text around it promises. */
  const promised: readonly RegExp[] = [
    /^admin, ADMIN$/m,
    /^HL-PR6-02, revision 1$/m,
    /^(RUNNING|DONE) [\d.]+$/m,
    /meets the mask by \d\.\d+ dB as set on this chip/,
    /^pump {2}MAX_TRANSMISSION_DB {2}-60 {2}-6\d\.[\s\S]*insertionLossDb[\s\S]*trap\.arm\.phase {2}[\d.]+ mA[\s\S]*LASER_RADIATION/m,
    /^frequencyThz,[\s\S]*^\d+ elements$/m,
    /^version 1\npublication 1$/m,
    /^sheet,chip,[\s\S]*^304$/m,
    /^publication 2[\s\S]*^200$|^200[\s\S]*^publication 2$/m,
    /order 11[\s\S]*less rejection[\s\S]*CHEBYSHEV_I of order 6/,
    /"order": 3[\s\S]*"met": true[\s\S]*"transmissionDb"/,
    /"serial": "HL-IL50-01"/,
    /"state":"DONE"/,
    /^200$/m,
    /"action": "release.published"/,
    /304, nothing new since/,
  ];
  let service: StartedService;
  beforeAll(async () => {
    service = await startService();
  });
  afterAll(() => service.stop());

  it('runs as written, one block after the other in one shell, and prints what the text says', async () => {
    expect(blocks).toHaveLength(promised.length);
    const mark = (i: number): string => `=== block ${i}`;
    const session = blocks.map((block, i) => `echo '${mark(i)}'\n${block}`).join('\n');
    // Every command of every block must succeed, within pipes too: stricter than a terminal.
    const { code, output } = await run('bash', ['-euo', 'pipefail', '-c', session], service.environment);
    expect(code, output).toBe(0);
    for (const [i, pattern] of promised.entries()) {
      const printed = output.split(`${mark(i)}\n`)[1]?.split('\n=== block ')[0];
      expect(printed, `block ${i}:\n${blocks[i]}`).toMatch(pattern);
    }
  }, 180_000);
});

describe('the README', () => {
  it('puts one paragraph and the two commands at the top', () => {
    expect(README).toMatch(
      /^# Ringbinder\n\n(?:[^\n]+\n)+\n```sh\nnpm ci && npm run demo\nnpm ci && npm test\n```\n/,
    );
  });

  it('tells every limit with its value', () => {
    const text = section('Limits');
    for (const [name, value] of Object.entries(LIMITS)) {
      expect(text, name).toMatch(new RegExp(`\`${name}\`( \\| | )${value}\\b`));
    }
  });

  it('lists every problem code under its status', () => {
    const rows = [...section('Errors').matchAll(/^\| (\d{3}) \| (.*) \|$/gm)].flatMap((row) =>
      [...row[2]!.matchAll(/`([A-Z_]+)`/g)].map((code) => [code[1]!, Number(row[1])] as const),
    );
    const expected = Object.entries(PROBLEM_TABLE).map(([code, { status }]) => [code, status] as const);
    expect(Object.fromEntries(rows)).toEqual(Object.fromEntries(expected));
    expect(rows).toHaveLength(expected.length);
  });

  it('has a row for every variable and none besides', () => {
    const named = [...section('Configuration').matchAll(/^\| `([A-Z_]+)` \|/gm)].map((row) => row[1]);
    expect(named).toEqual(CONFIGURATION.map(({ name }) => name));
  });

  it('names only scripts that package.json has', () => {
    const { scripts } = JSON.parse(read('package.json')) as { scripts: Record<string, string> };
    const named = DOCUMENTS.flatMap((file) =>
      [...read(file).matchAll(/npm run ([\w:-]+)/g)].map((found) => found[1]!),
    );
    expect(named.length).toBeGreaterThan(10);
    for (const name of named) expect(Object.keys(scripts)).toContain(name);
  });
});

/** GitHub's rule: lower case, punctuation dropped, spaces to hyphens. */
const anchorOf = (heading: string): string =>
  heading
    .toLowerCase()
    .replace(/[^\w\- ]/g, '')
    .replaceAll(' ', '-');

const anchorsIn = (text: string): Set<string> =>
  new Set([...text.matchAll(/^#{1,6} (.*)$/gm)].map((found) => anchorOf(found[1]!)));

describe.each(DOCUMENTS)('%s', (file) => {
  const text = read(file);
  // What stands in code is no link.
  const prose = text.replace(/^```[\s\S]*?^```$/gm, '').replace(/`[^`\n]*`/g, '');

  it('links to files and headings that exist', () => {
    for (const [, target = ''] of prose.matchAll(/\]\(([^)\s]+)\)/g)) {
      const [path = '', anchor] = target.split('#');
      expect(path, 'documents work without internet').not.toMatch(/^[a-z]+:/);
      const place = path === '' ? file : relative(ROOT, join(ROOT, dirname(file), path));
      expect(existsSync(join(ROOT, place)), `${file}: ${target}`).toBe(true);
      if (anchor !== undefined) expect(anchorsIn(read(place)), `${file}: ${target}`).toContain(anchor);
    }
  });

  it('names files and folders that exist', () => {
    for (const [, path = ''] of text
      .replace(/^```[\s\S]*?^```$/gm, '')
      .matchAll(/`((?:src|schema|server|test|examples|docs|prisma|scripts|\.ci)\/[\w./-]*)`/g)) {
      expect(existsSync(join(ROOT, path)), `${file}: ${path}`).toBe(true);
    }
  });
});

describe('docs/', () => {
  it('holds pictures that are whole and load nothing', () => {
    const pictures = readdirSync(join(ROOT, 'docs')).filter((name) => name.endsWith('.svg'));
    expect(pictures.length).toBeGreaterThan(0);
    for (const name of pictures) {
      const svg = read(`docs/${name}`);
      expect(svg).toMatch(/^<svg [\s\S]*<\/svg>\s*$/);
      expect(svg).not.toMatch(/<script|xlink:href|href="(?!#)|url\((?!#)/);
      expect(README).toContain(`docs/${name}`);
    }
  });
});
