import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  appliedWait,
  createTokenBuckets,
  equalsStrongly,
  equalsWeakly,
  evaluateRead,
  JsonRefused,
  matchedStrongly,
  matchesAny,
  negotiate,
  parseTagList,
  preferredWait,
  readIdempotencyKey,
  readJson,
  splitSuffix,
} from '../../../server/rest/protocol/index.ts';
import { standardExample } from './standards.ts';

describe('entity tags', () => {
  it('[published] compares weakly and strongly as the table of RFC 9110 section 8.8.3.2', () => {
    const { table } = standardExample<{ table: [string, string, boolean, boolean][] }>(
      'rfc9110.conditional',
      '8.8.3.2',
    );
    expect(table.length).toBe(4);
    for (const [a, b, strong, weak] of table) {
      expect([a, b, equalsStrongly(a, b), equalsWeakly(a, b)]).toEqual([a, b, strong, weak]);
    }
  });

  it('[published] evaluates If-Match by strong comparison, RFC 9110 section 13.1.1', () => {
    const cases = standardExample<{ if_match: string; current: string | null; expect: number | string }[]>(
      'rfc9110.conditional',
      '13.1.1',
    );
    expect(cases.length).toBe(4);
    for (const example of cases) {
      const list = parseTagList(example.if_match)!;
      const matched = matchedStrongly(list, example.current === null ? [] : [example.current]);
      expect({ ...example, passes: matched !== null }).toEqual({
        ...example,
        passes: example.expect !== 412,
      });
    }
  });

  it('[published] evaluates If-None-Match by weak comparison, RFC 9110 section 13.1.2', () => {
    const cases = standardExample<
      { method: string; if_none_match: string; current: string | null; expect: number | string }[]
    >('rfc9110.conditional', '13.1.2');
    expect(cases.length).toBe(5);
    for (const example of cases) {
      const fails = matchesAny(parseTagList(example.if_none_match)!, example.current);
      expect({ ...example, fails }).toEqual({
        ...example,
        fails: example.expect === 304 || example.expect === 412,
      });
    }
  });

  it('[published] evaluates If-Match before If-None-Match, RFC 9110 section 13.2.2', () => {
    const [example] = standardExample<{ if_match: string; if_none_match: string; current: string }[]>(
      'rfc9110.conditional',
      '13.2.2',
    );
    const verdict = evaluateRead(
      { ifMatch: parseTagList(example!.if_match)!, ifNoneMatch: parseTagList(example!.if_none_match)! },
      example!.current,
    );
    expect(verdict).toBe('FAILED');
  });

  it('[property] reads back any list of tags it is given', () => {
    const tag = fc
      .tuple(fc.boolean(), fc.stringMatching(/^[!#-~]{0,20}$/))
      .map(([weak, text]) => `${weak ? 'W/' : ''}"${text}"`);
    fc.assert(
      fc.property(
        fc.array(tag, { minLength: 1, maxLength: 5 }),
        fc.constantFrom(',', ', ', ' ,  '),
        (tags, separator) => {
          expect(parseTagList(tags.join(separator))).toEqual(tags);
        },
      ),
    );
  });

  it('refuses what is no list of tags', () => {
    for (const header of ['', 'abc', '"a" "b"', '*, "a"', '"a", *', 'w/"a"', '"a', '"a"b"']) {
      expect([header, parseTagList(header)]).toEqual([header, null]);
    }
  });
});

describe('Prefer', () => {
  // Syntax and examples: RFC 7240 sections 2 and 4.3, from memory.
  it('reads wait in every form of the syntax, the first of several, and clamps it to 60 s', () => {
    expect(preferredWait('wait=10')).toBe(10);
    expect(preferredWait('respond-async, WAIT = "7"')).toBe(7);
    expect(preferredWait('wait=3; foo=bar, wait=9')).toBe(3);
    expect(preferredWait(['respond-async', 'wait=4'])).toBe(4);
    expect(preferredWait('wait=0')).toBe(0);
    expect(appliedWait(preferredWait('wait=86400')!)).toBe('wait=60');
  });

  it('ignores a preference that is malformed or unknown', () => {
    for (const header of [
      undefined,
      '',
      'wait',
      'wait=',
      'wait=-1',
      'wait=1.5',
      'wait=abc',
      'awaits=3',
      'wait=1x',
    ]) {
      expect([header, preferredWait(header)]).toEqual([header, null]);
    }
  });
});

describe('JSON bodies', () => {
  it('[published] accepts and refuses the numbers of RFC 8259 section 6', () => {
    const { valid, invalid } = standardExample<{ valid: string[]; invalid: string[] }>('rfc8259.json', '6');
    for (const text of valid) expect(readJson(text)).toBe(Number(text));
    for (const text of invalid) expect(() => readJson(text), text).toThrow(JsonRefused);
  });

  it('[property] reads whatever JSON.stringify writes, as JSON.parse does', () => {
    const wellFormed = fc.string({ unit: 'grapheme' }).filter((text) => !text.includes('\u0000'));
    const names = fc.string().filter((name) => !/^(__proto__|constructor|prototype)$|\0/.test(name));
    const { tree } = fc.letrec<{ tree: unknown }>((tie) => ({
      tree: fc.oneof(
        { maxDepth: 4 },
        fc.oneof(
          fc.constant(null),
          fc.boolean(),
          fc.double({ noNaN: true, noDefaultInfinity: true }),
          wellFormed,
        ),
        fc.array(tie('tree'), { maxLength: 4 }),
        fc.dictionary(names, tie('tree'), { maxKeys: 4 }),
      ),
    }));
    fc.assert(
      fc.property(tree, fc.constantFrom(undefined, 2, '\t'), (value, indent) => {
        const text = JSON.stringify(value, null, indent);
        expect(JSON.stringify(readJson(text))).toBe(JSON.stringify(JSON.parse(text)));
      }),
    );
  });

  it('[property] refuses exactly what JSON.parse refuses when one character of a text is changed', () => {
    const text = '{"a": [1, -2.5e3, true, null], "b": {"c": "x\\u0041\\n"}, "d": ""}';
    fc.assert(
      fc.property(fc.nat(text.length - 1), fc.constantFrom(...'{}[]",:0e.-+ \\tx'), (at, character) => {
        const changed = text.slice(0, at) + character + text.slice(at + 1);
        let parses = true;
        try {
          JSON.parse(changed);
        } catch {
          parses = false;
        }
        let reads = true;
        try {
          readJson(changed);
        } catch (error) {
          // Repeated members are the one thing refused beyond the grammar that this text can turn into.
          reads = (error as JsonRefused).reason.includes('appears twice');
        }
        expect([changed, reads]).toEqual([changed, parses]);
      }),
      { numRuns: 2000 },
    );
  });

  it('says where and why', () => {
    const refusals: [string, string, string, number, number][] = [
      ['{"a": NaN}', 'NaN is not a JSON number', '/a', 1, 7],
      ['{"a":\n [1,\n  -Infinity]}', '-Infinity is not a JSON number', '/a/1', 3, 3],
      [
        '{"specification": {"rippleDb": 1e400}}',
        'the number 1e400 is beyond the range of a double',
        '/specification/rippleDb',
        1,
        32,
      ],
      ['{"note": "a\\u0000b"}', 'the string holds the character U+0000', '/note', 1, 10],
      ['{"note": "\\ud800"}', 'the string holds half of a surrogate pair', '/note', 1, 10],
      ['{"__proto__": {"admin": true}}', "the member name '__proto__' is not accepted", '', 1, 2],
      ['{"a/b~c": {"x": 1, "x": 2}}', "the member 'x' appears twice", '/a~1b~0c', 1, 20],
      ['{"a": 1', "',' or '}' is expected, not end of the body", '', 1, 8],
      ['', 'unexpected end of the body', '', 1, 1],
      ['{} {}', "unexpected '{' after the end of the JSON value", '', 1, 4],
      ["{'a': 1}", "a member name in quotes is expected, not '''", '', 1, 2],
      ['[1,]', "unexpected ']'", '/1', 1, 4],
      ['["a\tb"]', 'unexpected character U+0009 in a string', '/0', 1, 4],
    ];
    for (const [text, reason, pointer, line, column] of refusals) {
      let error: unknown;
      try {
        readJson(text);
      } catch (thrown) {
        error = thrown;
      }
      expect(error).toBeInstanceOf(JsonRefused);
      const { reason: said, pointer: at, line: row, column: place } = error as JsonRefused;
      expect([text, said, at, row, place]).toEqual([text, reason, pointer, line, column]);
    }
  });

  it('refuses nesting that could exhaust the stack', () => {
    expect(() => readJson('['.repeat(100_000))).toThrow(/nested deeper than 64/);
  });
});

describe('representations', () => {
  const offers = [
    { suffix: 'json', mediaType: 'application/json' },
    { suffix: 'csv', mediaType: 'text/csv' },
  ];

  // Media ranges and their precedence: RFC 9110 section 12.5.1, from memory.
  it('takes the most specific range, then the highest quality, then the first offer', () => {
    const chosen = (accept?: string): string | null => negotiate(accept, offers)?.suffix ?? null;
    expect(chosen()).toBe('json');
    expect(chosen('*/*')).toBe('json');
    expect(chosen('text/csv')).toBe('csv');
    expect(chosen('text/*;q=0.5, application/json;q=0.4')).toBe('csv');
    expect(chosen('text/csv;q=0, */*')).toBe('json');
    expect(chosen('text/csv; header=present, */*;q=0.1')).toBe('csv');
    expect(chosen('image/png')).toBe(null);
    expect(chosen('application/json;q=0')).toBe(null);
  });

  it('splits a known suffix only', () => {
    expect(splitSuffix('current.csv', offers)).toEqual({ stem: 'current', suffix: 'csv' });
    expect(splitSuffix('v1.2', offers)).toEqual({ stem: 'v1.2', suffix: null });
    expect(splitSuffix('.csv', offers)).toEqual({ stem: '.csv', suffix: null });
  });
});

describe('idempotency keys', () => {
  it('takes 1 to 128 visible characters, quoted or not', () => {
    expect(readIdempotencyKey(undefined)).toBe(undefined);
    expect(readIdempotencyKey('abc-123')).toBe('abc-123');
    expect(readIdempotencyKey('"abc-123"')).toBe('abc-123');
    for (const header of ['', '""', 'a b', 'x'.repeat(129), 'ä', '"a']) {
      expect([header, readIdempotencyKey(header)]).toEqual([header, null]);
    }
  });
});

describe('token buckets', () => {
  it('grants the burst at once, then the steady rate, and says when the next is due', () => {
    let nowMs = 0;
    const buckets = createTokenBuckets({ perSecond: 50, burst: 100 }, () => nowMs);
    for (let i = 0; i < 100; i++) expect(buckets.take('a')).toBe(0);
    expect(buckets.take('a')).toBe(1);
    expect(buckets.take('b')).toBe(0);
    let granted = 0;
    for (; nowMs < 10_000; nowMs += 10) if (buckets.take('a') === 0) granted += 1;
    expect(granted).toBe(499);
  });

  it('keeps a bounded number of keys', () => {
    let nowMs = 0;
    const buckets = createTokenBuckets({ perSecond: 50, burst: 100 }, () => nowMs++);
    for (let i = 0; i < 50_000; i++) buckets.take(`address ${i}`);
    expect(buckets.size).toBeLessThanOrEqual(10_000);
  });
});
