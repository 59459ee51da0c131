import { describe, expect, it } from 'vitest';
import { partsOf, pointerOf, valueAt, withEdits } from '../../schema/pointer.ts';

/** The document of RFC 6901, section 5 (typed from memory). */
const DOCUMENT = {
  foo: ['bar', 'baz'],
  '': 0,
  'a/b': 1,
  'c%d': 2,
  'e^f': 3,
  'g|h': 4,
  'i\\j': 5,
  'k"l': 6,
  ' ': 7,
  'm~n': 8,
};

describe('pointers', () => {
  it.each([
    ['', DOCUMENT],
    ['/foo', ['bar', 'baz']],
    ['/foo/0', 'bar'],
    ['/', 0],
    ['/a~1b', 1],
    ['/c%d', 2],
    ['/e^f', 3],
    ['/g|h', 4],
    ['/i\\j', 5],
    ['/k"l', 6],
    ['/ ', 7],
    ['/m~0n', 8],
  ])('[published] %j leads to the value of RFC 6901, section 5', (pointer, value) => {
    expect(valueAt(DOCUMENT, partsOf(pointer))).toEqual(value);
    expect(pointerOf(partsOf(pointer))).toBe(pointer);
  });

  it('[property] leads nowhere where nothing is, inherited members included', () => {
    expect(valueAt(DOCUMENT, ['foo', '7'])).toBeUndefined();
    expect(valueAt(DOCUMENT, ['constructor'])).toBeUndefined();
    expect(valueAt(DOCUMENT, ['foo', '0', 'length'])).toBeUndefined();
  });
});

describe('edits', () => {
  it('[property] leave the original alone and make missing objects', () => {
    const given = { a: { b: 1 } };
    expect(withEdits(given, [{ pointer: '/a/c/d', works: 2 }])).toEqual({ a: { b: 1, c: { d: 2 } } });
    expect(given).toEqual({ a: { b: 1 } });
  });

  it('[property] remove entries of a list by the places they had', () => {
    const edits = [
      { pointer: '/0', works: null },
      { pointer: '/2', works: null },
      { pointer: '/1', works: 'B' },
    ];
    expect(withEdits(['a', 'b', 'c', 'd'], edits)).toEqual(['B', 'd']);
  });
});
