import canonicalize from 'canonicalize';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { canonicalJson } from '../../schema/jcs.ts';

/** The package's types hide that its export is a function. */
const reference = canonicalize as unknown as (value: unknown) => string | undefined;

/** RFC 8785, Appendix B: IEEE 754 bits and the text they must become (typed from memory). */
const NUMBERS: readonly (readonly [string, string])[] = [
  ['0000000000000000', '0'],
  ['8000000000000000', '0'],
  ['0000000000000001', '5e-324'],
  ['8000000000000001', '-5e-324'],
  ['7fefffffffffffff', '1.7976931348623157e+308'],
  ['ffefffffffffffff', '-1.7976931348623157e+308'],
  ['4340000000000000', '9007199254740992'],
  ['c340000000000000', '-9007199254740992'],
  ['4430000000000000', '295147905179352830000'],
  ['44b52d02c7e14af5', '9.999999999999997e+22'],
  ['44b52d02c7e14af6', '1e+23'],
  ['44b52d02c7e14af7', '1.0000000000000001e+23'],
  ['444b1ae4d6e2ef4e', '999999999999999700000'],
  ['444b1ae4d6e2ef4f', '999999999999999900000'],
  ['444b1ae4d6e2ef50', '1e+21'],
  ['3eb0c6f7a0b5ed8c', '9.999999999999997e-7'],
  ['3eb0c6f7a0b5ed8d', '0.000001'],
  ['41b3de4355555553', '333333333.3333332'],
  ['41b3de4355555554', '333333333.33333325'],
  ['41b3de4355555555', '333333333.3333333'],
  ['41b3de4355555556', '333333333.3333334'],
  ['41b3de4355555557', '333333333.33333343'],
  ['becbf647612f3696', '-0.0000033333333333333333'],
  ['43143ff3c1cb0959', '1424953923781206.2'],
];

function fromBits(hex: string): number {
  return Buffer.from(hex, 'hex').readDoubleBE();
}

describe('canonical JSON', () => {
  it.each(NUMBERS)('[published] writes the number %s as %s (RFC 8785, Appendix B)', (bits, text) => {
    expect(canonicalJson(fromBits(bits))).toBe(text);
  });

  it('[published] writes literals, numbers and strings as in the example of RFC 8785, section 3.2.2', () => {
    const value: unknown = JSON.parse(
      String.raw`{"numbers":[333333333.33333329,1E30,4.50,2e-3,0.000000000000000000000000001],"string":"\u20ac$\u000F\u000aA'\u0042\u0022\u005c\\\"\/","literals":[null,true,false]}`,
    );
    expect(canonicalJson(value)).toBe(
      '{"literals":[null,true,false],"numbers":[333333333.3333333,1e+30,4.5,0.002,1e-27],"string":"€$\\u000f\\nA\'B\\"\\\\\\\\\\"/"}',
    );
  });

  it('[published] sorts members by UTF-16 code units as in RFC 8785, section 3.2.3', () => {
    const value = {
      '\u20ac': 'Euro Sign',
      '\r': 'Carriage Return',
      '\ufb33': 'Hebrew Letter Dalet With Dagesh',
      '1': 'One',
      '\ud83d\ude00': 'Emoji: Grinning Face',
      '\u0080': 'Control',
      '\u00f6': 'Latin Small Letter O With Diaeresis',
    };
    expect(Object.values(JSON.parse(canonicalJson(value)) as object).slice(1)).toEqual([
      'Carriage Return',
      'Control',
      'Latin Small Letter O With Diaeresis',
      'Euro Sign',
      'Emoji: Grinning Face',
      'Hebrew Letter Dalet With Dagesh',
    ]);
  });

  it('[cross-check] agrees with the npm package canonicalize on any JSON value', () => {
    fc.assert(
      fc.property(fc.jsonValue(), (value) => {
        expect(canonicalJson(value)).toBe(reference(value));
      }),
    );
  });

  it.each([
    ['NaN', Number.NaN],
    ['Infinity', { a: [Number.POSITIVE_INFINITY] }],
    ['a lone surrogate', 'x\ud800'],
    ['a lone surrogate as a name', { '\udc00': 1 }],
    ['a function', () => 1],
    ['undefined in a list', [undefined]],
  ])('[property] refuses %s (RFC 8785, section 3.2.2.2 and 3.2.2.3)', (_, value) => {
    expect(() => canonicalJson(value)).toThrow(TypeError);
  });
});
