/**
 * A JSON reader (RFC 8259) for request bodies, stricter than `JSON.parse` where leniency would hide a mistake: a number
 * beyond double range, a repeated member, a lone surrogate, a NUL character and member names that reach a prototype are
 * refused, each with its place.
 */
import { pointerOf } from '../../../schema/pointer.ts';

/** Deepest nesting accepted: our deepest body has 8 levels, and recursion must not reach the end of the stack. */
const DEEPEST = 64;

const FORBIDDEN_NAMES = new Set(['__proto__', 'constructor', 'prototype']);
const NUMBER = /-?(?:0|[1-9]\d*)(?:\.\d+)?(?:[eE][+-]?\d+)?/y;
// biome-ignore lint/suspicious/noControlCharactersInRegex: RFC 8259 section 7 forbids exactly these inside a string
const PLAIN = /[^"\\\u0000-\u001f]*/y;
/** With the `u` flag a pair is one code point, so that only half a pair is a surrogate. */
const LONE_SURROGATE = /\p{Surrogate}/u;
const ESCAPES: Readonly<Record<string, string>> = {
  '"': '"',
  '\\': '\\',
  '/': '/',
  b: '\b',
  f: '\f',
  n: '\n',
  r: '\r',
  t: '\t',
};

/** Where and why a text was refused. */
export class JsonRefused extends Error {
  override readonly name = 'JsonRefused';
  constructor(
    readonly reason: string,
    /** RFC 6901 pointer of the value being read. */
    readonly pointer: string,
    /** From 0, in UTF-16 units. */
    readonly offset: number,
    readonly line: number,
    readonly column: number,
  ) {
    super(`${reason} at line ${line}, column ${column} (character ${offset})`);
  }
}

interface Reader {
  readonly text: string;
  at: number;
  readonly path: (string | number)[];
}

/** Linear in the length of `text`. Throws `JsonRefused`. */
export function readJson(text: string): unknown {
  const reader: Reader = { text, at: 0, path: [] };
  const value = readValue(reader);
  skipSpace(reader);
  if (reader.at < text.length)
    refuse(reader, `unexpected ${show(text, reader.at)} after the end of the JSON value`);
  return value;
}

function refuse(reader: Reader, reason: string, offset = reader.at): never {
  const before = reader.text.slice(0, offset);
  const line = before.split('\n').length;
  const column = offset - before.lastIndexOf('\n');
  throw new JsonRefused(reason, pointerOf(reader.path), offset, line, column);
}

function show(text: string, at: number): string {
  if (at >= text.length) return 'end of the body';
  const code = text.charCodeAt(at);
  if (code < 0x20 || (code >= 0x7f && code < 0xa0) || (code & 0xf800) === 0xd800) {
    return `character U+${code.toString(16).toUpperCase().padStart(4, '0')}`;
  }
  return `'${text[at]}'`;
}

function skipSpace(reader: Reader): void {
  for (;;) {
    const code = reader.text.charCodeAt(reader.at);
    if (code !== 0x20 && code !== 0x0a && code !== 0x0d && code !== 0x09) return;
    reader.at += 1;
  }
}

function readValue(reader: Reader): unknown {
  skipSpace(reader);
  const first = reader.text[reader.at];
  switch (first) {
    case '{':
      return readObject(reader);
    case '[':
      return readArray(reader);
    case '"':
      return readString(reader);
    case 't':
      return readWord(reader, 'true', true);
    case 'f':
      return readWord(reader, 'false', false);
    case 'n':
      return readWord(reader, 'null', null);
    default:
      return readNumber(reader);
  }
}

function readWord<T>(reader: Reader, word: string, value: T): T {
  if (!reader.text.startsWith(word, reader.at)) refuse(reader, `unexpected ${show(reader.text, reader.at)}`);
  reader.at += word.length;
  return value;
}

function readNumber(reader: Reader): number {
  const { text, at } = reader;
  NUMBER.lastIndex = at;
  const found = NUMBER.exec(text);
  if (!found) {
    const word = /^[+-]?(?:NaN|Infinity)/.exec(text.slice(at, at + 12));
    refuse(reader, word ? `${word[0]} is not a JSON number` : `unexpected ${show(text, at)}`);
  }
  const value = Number(found[0]);
  if (!Number.isFinite(value))
    refuse(reader, `the number ${found[0].slice(0, 40)} is beyond the range of a double`);
  reader.at = NUMBER.lastIndex;
  if (/[0-9.eE+-]/.test(text[reader.at] ?? ''))
    refuse(reader, `unexpected ${show(text, reader.at)} in a number`);
  return value;
}

function readString(reader: Reader): string {
  const { text } = reader;
  const start = reader.at;
  reader.at += 1;
  let value = '';
  for (;;) {
    PLAIN.lastIndex = reader.at;
    value += PLAIN.exec(text)![0];
    reader.at = PLAIN.lastIndex;
    const stop = text[reader.at];
    if (stop === '"') break;
    if (stop !== '\\') {
      refuse(
        reader,
        stop === undefined ? 'the string does not end' : `unexpected ${show(text, reader.at)} in a string`,
      );
    }
    value += readEscape(reader);
  }
  reader.at += 1;
  if (LONE_SURROGATE.test(value)) refuse(reader, 'the string holds half of a surrogate pair', start);
  if (value.includes('\u0000')) refuse(reader, 'the string holds the character U+0000', start);
  return value;
}

function readEscape(reader: Reader): string {
  const { text, at } = reader;
  const letter = text[at + 1] ?? '';
  if (letter === 'u') {
    const digits = text.slice(at + 2, at + 6);
    if (!/^[0-9a-fA-F]{4}$/.test(digits)) refuse(reader, 'a \\u escape needs four hexadecimal digits');
    reader.at += 6;
    return String.fromCharCode(Number.parseInt(digits, 16));
  }
  const value = ESCAPES[letter];
  if (value === undefined) refuse(reader, `\\${letter} is no JSON escape`);
  reader.at += 2;
  return value;
}

function enter(reader: Reader): void {
  if (reader.path.length >= DEEPEST) refuse(reader, `nested deeper than ${DEEPEST} levels`);
  reader.at += 1;
  skipSpace(reader);
}

function readArray(reader: Reader): unknown[] {
  const values: unknown[] = [];
  enter(reader);
  if (reader.text[reader.at] === ']') {
    reader.at += 1;
    return values;
  }
  for (;;) {
    reader.path.push(values.length);
    values.push(readValue(reader));
    reader.path.pop();
    if (endsAfterMember(reader, ']')) return values;
  }
}

function readObject(reader: Reader): Record<string, unknown> {
  const members: Record<string, unknown> = {};
  enter(reader);
  if (reader.text[reader.at] === '}') {
    reader.at += 1;
    return members;
  }
  for (;;) {
    skipSpace(reader);
    const start = reader.at;
    if (reader.text[start] !== '"')
      refuse(reader, `a member name in quotes is expected, not ${show(reader.text, start)}`);
    const name = readString(reader);
    if (FORBIDDEN_NAMES.has(name)) refuse(reader, `the member name '${name}' is not accepted`, start);
    if (Object.hasOwn(members, name)) refuse(reader, `the member '${name}' appears twice`, start);
    skipSpace(reader);
    if (reader.text[reader.at] !== ':')
      refuse(reader, `':' is expected, not ${show(reader.text, reader.at)}`);
    reader.at += 1;
    reader.path.push(name);
    members[name] = readValue(reader);
    reader.path.pop();
    if (endsAfterMember(reader, '}')) return members;
  }
}

function endsAfterMember(reader: Reader, close: ']' | '}'): boolean {
  skipSpace(reader);
  const next = reader.text[reader.at];
  if (next !== close && next !== ',')
    refuse(reader, `',' or '${close}' is expected, not ${show(reader.text, reader.at)}`);
  reader.at += 1;
  return next === close;
}
