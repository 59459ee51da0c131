import { randomUUID } from 'node:crypto';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import type { Acting, StoreEvent, TokenRecord } from '../../../server/store/index.ts';
import { isBlocked, type Library, makeToken, openLibrary } from '../../support/library.ts';

const secret = () => ({
  lookup: randomUUID().replaceAll('-', '').slice(0, 12),
  secretHash: Buffer.alloc(32, 7),
});

describe('people and their tokens', () => {
  let library: Library;
  beforeAll(async () => {
    library = await openLibrary();
  });
  afterAll(() => library.close());
  const actingAs = (token: TokenRecord): Acting => ({ actorId: token.actor.id, tokenId: token.id });

  it('a first start makes the first admin once, however many processes start', async () => {
    const asks = Array.from({ length: 6 }, secret);
    const won = await Promise.all(asks.map((ask) => library.store.bootstrapAdmin(ask)));
    expect(won.filter(Boolean)).toHaveLength(1);
    const found = await Promise.all(asks.map((ask) => library.store.findToken(ask.lookup)));
    expect(found.map((token) => token !== null)).toEqual(won);
    expect(found.find((token) => token)).toMatchObject({ role: 'ADMIN', expiresAt: null, revokedAt: null });
    expect(await library.store.bootstrapAdmin(secret())).toBe(false);
  });

  it('a token is found by its public part, with its actor and the hash of its secret', async () => {
    const made = await makeToken(library.store, library.by, 'invented-reader', 'READER');
    const found = await library.store.findToken(made.lookup);
    expect(found).toEqual(made);
    expect(found?.secretHash).toHaveLength(32);
    expect(found?.createdBy).toBe(library.by.actorId);
    expect(await library.store.findTokenById(made.id)).toEqual(made);
    expect(await library.store.findToken('unknown00000')).toBeNull();
    expect(await library.store.findTokenById('not a uuid')).toBeNull();
    expect((await library.store.listTokens()).map((token) => token.id)).toContain(made.id);
    expect(await library.store.findActors([made.actor.id, randomUUID(), 'not a uuid'])).toEqual([made.actor]);
  });

  it('several tokens of one name belong to one actor; a name of another kind is taken', async () => {
    const one = await makeToken(library.store, library.by, 'invented-bench', 'INSTRUMENT');
    const two = await makeToken(library.store, library.by, 'invented-bench', 'INSTRUMENT');
    expect(one.actor).toEqual(two.actor);
    const other = await library.store.createToken(library.by, {
      actor: 'invented-bench',
      actorKind: 'PERSON',
      role: 'READER',
      label: '',
      expiresAt: null,
      ...secret(),
    });
    expect(other).toEqual({ outcome: 'NAME_TAKEN' });
  });

  it('revoking is final, told to every process, and repeated answers the same', async () => {
    const events: StoreEvent[] = [];
    const stop = library.store.notifications.subscribe((event) => events.push(event));
    const token = await makeToken(library.store, library.by, 'invented-leaver', 'READER');
    const revoked = await library.store.revokeToken(library.by, token.id);
    expect(revoked).toMatchObject({
      outcome: 'WRITTEN',
      replayed: false,
      record: { revokedAt: expect.any(Date) },
    });
    expect(await library.store.revokeToken(library.by, token.id)).toEqual({ ...revoked, replayed: true });
    await expect.poll(() => events).toEqual([{ kind: 'TOKEN', id: token.id }]);
    stop();
    expect(await library.store.revokeToken(library.by, randomUUID())).toEqual({ outcome: 'NOT_FOUND' });
    for (const change of ['revoked_at = null, revoked_by = null', "role = 'ADMIN'", "label = 'other'"]) {
      await expect(
        library.query(`update token set ${change} where id = $1`, [token.id]),
      ).rejects.toMatchObject({
        code: '23001',
      });
    }
  });

  it('the last admin stays: two who revoke each other at once leave one', async () => {
    const one = await makeToken(library.store, library.by, 'invented-admin-1', 'ADMIN');
    const two = await makeToken(library.store, library.by, 'invented-admin-2', 'ADMIN');
    const tokens = await library.store.listTokens();
    for (const token of tokens.filter(
      (each) => each.role === 'ADMIN' && ![one.id, two.id].includes(each.id),
    )) {
      await library.store.revokeToken(library.by, token.id);
    }
    const both = await Promise.all([
      library.store.revokeToken(actingAs(one), two.id),
      library.store.revokeToken(actingAs(two), one.id),
    ]);
    expect(both.map((each) => each.outcome).sort()).toEqual(['LAST_ADMIN', 'WRITTEN']);
    const live = (await library.store.listTokens()).filter(
      (each) => each.role === 'ADMIN' && !each.revokedAt,
    );
    expect(live).toHaveLength(1);
    expect(await library.store.revokeToken(library.by, live[0]!.id)).toEqual({ outcome: 'LAST_ADMIN' });
  });

  it('revoking an admin waits for another revocation in progress', async () => {
    const [last] = (await library.store.listTokens()).filter(
      (each) => each.role === 'ADMIN' && !each.revokedAt,
    );
    const next = await makeToken(library.store, library.by, 'invented-admin-3', 'ADMIN');
    const revoking = await library.session();
    await revoking.query('begin');
    await revoking.query(
      "select id from token where role = 'ADMIN' and revoked_at is null order by id for update",
    );
    const waiting = library.store.revokeToken(library.by, last!.id);
    expect(await isBlocked(waiting)).toBe(true);
    await revoking.query('update token set revoked_at = now(), revoked_by = $2 where id = $1', [
      next.id,
      library.by.actorId,
    ]);
    await revoking.query('commit');
    expect(await waiting).toEqual({ outcome: 'LAST_ADMIN' });
  });

  it('use is noted at most once a minute', async () => {
    const token = await makeToken(library.store, library.by, 'invented-user', 'READER');
    const used = async () => (await library.store.findTokenById(token.id))?.lastUsedAt;
    expect(await used()).toBeNull();
    await library.store.noteTokenUse(token.id);
    const first = await used();
    await library.store.noteTokenUse(token.id);
    expect(await used()).toEqual(first);
    await library.query(
      "update token_use set last_used_at = now() - interval '61 seconds' where token_id = $1",
      [token.id],
    );
    const old = await used();
    await library.store.noteTokenUse(token.id);
    expect((await used())?.getTime()).toBeGreaterThan(old!.getTime());
  });
});
