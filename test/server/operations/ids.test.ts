import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { opaqueIdRule } from '../../../schema/text.ts';
import { decodeCursor, encodeCursor } from '../../../server/operations/cursor.ts';
import {
  historyId,
  historyNumberOfId,
  releaseId,
  releaseKeyOfId,
  uuidOfId,
  wireId,
} from '../../../server/operations/ids.ts';

describe('opaque ids', () => {
  it('[property] come back to their uuid, and to no other kind', () => {
    fc.assert(
      fc.property(fc.uuid(), (uuid) => {
        const id = wireId('chp', uuid);
        expect(opaqueIdRule.safeParse(id).success).toBe(true);
        expect(uuidOfId('chp', id)).toBe(uuid);
        expect(uuidOfId('rev', id)).toBeNull();
      }),
    );
  });

  it('[property] have one spelling', () => {
    const id = wireId('chp', 'ffffffff-ffff-ffff-ffff-ffffffffffff');
    expect(uuidOfId('chp', `${id.slice(0, -1)}z`)).toBeNull();
    expect(uuidOfId('chp', id.toUpperCase())).toBeNull();
    expect(uuidOfId('chp', `${id}0`)).toBeNull();
    expect(uuidOfId('chp', 'chp_')).toBeNull();
  });

  it('[property] of releases and history entries come back to their keys', () => {
    const name = fc.stringMatching(/^[A-Za-z0-9][A-Za-z0-9._-]{0,63}$/);
    fc.assert(
      fc.property(fc.uuid(), name, fc.integer({ min: 1, max: 2 ** 31 - 1 }), (chipId, release, sequence) => {
        const key = { chipId, name: release, sequence };
        const id = releaseId(key);
        expect(opaqueIdRule.safeParse(id).success).toBe(true);
        expect(releaseKeyOfId(id)).toEqual(key);
      }),
    );
    expect(historyNumberOfId(historyId('9007199254740993'))).toBe('9007199254740993');
    expect(releaseKeyOfId('rel_')).toBeNull();
    expect(historyNumberOfId('hst_0')).toBeNull();
  });
});

describe('cursors', () => {
  const context = { list: 'designs', filter: { met: true }, order: 'NEWEST' };

  it('[property] come back to their sort key', () => {
    const key = ['2026-03-01T00:00:00.000Z', 3, null] as const;
    expect(decodeCursor(encodeCursor(key, context), context)).toEqual(key);
  });

  it.each([
    ['of another filter', encodeCursor(['a'], { ...context, filter: {} })],
    ['of another list', encodeCursor(['a'], { ...context, list: 'chips' })],
    ['that are no cursors', 'abc'],
    ['that are empty', ''],
    ['with parts that are no keys', Buffer.from(JSON.stringify(['x', {}])).toString('base64url')],
  ])('[property] %s are refused', (_, cursor) => {
    expect(() => decodeCursor(cursor, context)).toThrow(
      expect.objectContaining({ problem: expect.objectContaining({ code: 'BAD_CURSOR', status: 400 }) }),
    );
  });
});
