import { createHash } from 'node:crypto';
import { afterAll, beforeAll, describe, expect, it, vi } from 'vitest';
import {
  type Action,
  type Authenticator,
  authorise,
  createAuthenticator,
  ensureFirstAdmin,
  generateToken,
  may,
  RIGHTS,
  type Viewer,
} from '../../../server/auth/index.ts';
import { ProblemError } from '../../../server/errors.ts';
import { createStore, type Role, type Store, type StoreEvent } from '../../../server/store/index.ts';
import { createTestDatabase, execute, type TestDatabase } from '../../support/postgres.ts';

const ROLES: readonly Role[] = ['READER', 'DESIGNER', 'INSTRUMENT', 'ADMIN'];

let database: TestDatabase;
let store: Store;
let admin: Viewer;
const adminToken = generateToken().token;
let now = Date.now();

async function problemOf(work: Promise<unknown>): Promise<ProblemError> {
  const error = await work.then(
    () => null,
    (thrown: unknown) => thrown,
  );
  expect(error).toBeInstanceOf(ProblemError);
  return error as ProblemError;
}

async function newToken(role: Role, expiresAt: Date | null = null) {
  const { token, lookup, secretHash } = generateToken();
  const ask = { actor: `invented ${role}`, actorKind: 'PERSON' as const, role, label: 'test', expiresAt };
  const made = await store.createToken(
    { actorId: admin.actor.id, tokenId: admin.tokenId },
    { ...ask, lookup, secretHash },
  );
  if (made.outcome !== 'WRITTEN') throw new Error(made.outcome);
  return { token, id: made.record.id };
}

/** Counts the look-ups that reach the database. */
function counted(authenticatorStore: Store) {
  let lookUps = 0;
  const authenticator: Authenticator = createAuthenticator({
    store: {
      notifications: authenticatorStore.notifications,
      noteTokenUse: (id) => authenticatorStore.noteTokenUse(id),
      findToken(lookup) {
        lookUps += 1;
        return authenticatorStore.findToken(lookup);
      },
    },
    clock: () => now,
  });
  return { authenticator, lookUps: () => lookUps };
}

beforeAll(async () => {
  database = await createTestDatabase();
  store = await createStore({ databaseUrl: database.url });
  await ensureFirstAdmin(store, adminToken);
  const { authenticator } = counted(store);
  admin = await authenticator.authenticate(`Bearer ${adminToken}`);
  authenticator.close();
});

afterAll(async () => {
  await store.close();
  await database.drop();
});

describe('the first administrator', () => {
  it('[property] is made once, however often the service starts', async () => {
    expect(admin.role).toBe('ADMIN');
    expect(await ensureFirstAdmin(store)).toBeNull();
    const { authenticator } = counted(store);
    const late = generateToken().token;
    expect(await ensureFirstAdmin(store, late)).toBeNull();
    expect((await problemOf(authenticator.authenticate(`Bearer ${late}`))).status).toBe(401);
    authenticator.close();
  });

  it('[property] is refused a token that is none', async () => {
    await expect(ensureFirstAdmin(store, 'rbt_short')).rejects.toThrow(/rbt_/);
  });
});

describe('a token', () => {
  it('[property] is stored as the SHA-256 of its secret, which is 256 random bits', async () => {
    const { token, id } = await newToken('READER');
    const secret = token.split('_').slice(2).join('_');
    expect(Buffer.from(secret, 'base64url')).toHaveLength(32);
    const record = await store.findTokenById(id);
    expect(record?.secretHash.equals(createHash('sha256').update(secret).digest())).toBe(true);
    expect(JSON.stringify(record)).not.toContain(secret);
  });

  it.each([
    ['is missing', undefined, /carries no token/, 'Bearer realm="ringbinder"'],
    ['is of another scheme', 'Basic YTpi', /malformed/, 'Bearer realm="ringbinder", error="invalid_token"'],
    ['is cut short', 'Bearer rbt_abc', /malformed/, 'Bearer realm="ringbinder", error="invalid_token"'],
    [
      'was never issued',
      `Bearer ${generateToken().token}`,
      /never issued/,
      'Bearer realm="ringbinder", error="invalid_token"',
    ],
  ])(
    '[published] that %s is refused with the challenge of RFC 6750, section 3',
    async (_, header, detail, challenge) => {
      const { authenticator } = counted(store);
      const refused = await problemOf(authenticator.authenticate(header));
      authenticator.close();
      expect(refused.problem).toMatchObject({ code: 'UNAUTHENTICATED', status: 401 });
      expect(refused.problem.detail).toMatch(detail);
      expect(refused.headers['www-authenticate']).toBe(challenge);
    },
  );

  it('[property] with a wrong secret is refused like an unknown one', async () => {
    const { token } = await newToken('READER');
    const { authenticator } = counted(store);
    const other = `${token.slice(0, 17)}${generateToken().token.slice(17)}`;
    const refused = await problemOf(authenticator.authenticate(`Bearer ${other}`));
    authenticator.close();
    expect(refused.problem.detail).toMatch(/never issued/);
  });

  it('[property] ends at its time, although it is remembered', async () => {
    const { token } = await newToken('READER', new Date(now + 60_000));
    const { authenticator } = counted(store);
    expect((await authenticator.authenticate(`Bearer ${token}`)).role).toBe('READER');
    now += 60_000;
    expect((await problemOf(authenticator.authenticate(`Bearer ${token}`))).problem.detail).toMatch(
      /expired/,
    );
    authenticator.close();
  });

  it('[property] is looked up once, and again after it was revoked', async () => {
    const { token, id } = await newToken('DESIGNER');
    const { authenticator, lookUps } = counted(store);
    for (let i = 0; i < 5; i += 1) await authenticator.authenticate(`Bearer ${token}`);
    expect(lookUps()).toBe(1);
    const heard = new Promise<StoreEvent>((resolve) => {
      const stop = store.notifications.subscribe((event) => {
        if (event.kind !== 'TOKEN' || event.id !== id) return;
        stop();
        resolve(event);
      });
    });
    await store.revokeToken({ actorId: admin.actor.id, tokenId: admin.tokenId }, id);
    await heard;
    const refused = await problemOf(authenticator.authenticate(`Bearer ${token}`));
    authenticator.close();
    expect(refused.problem.detail).toMatch(/revoked/);
    expect(lookUps()).toBe(2);
  });

  it('[property] is looked up every time while nobody would tell of a revocation', async () => {
    const { token } = await newToken('DESIGNER');
    const { authenticator, lookUps } = counted(store);
    await authenticator.authenticate(`Bearer ${token}`);
    await execute(
      database.url,
      `select pg_terminate_backend(pid) from pg_stat_activity
       where datname = current_database() and query ilike 'listen%' and pid <> pg_backend_pid()`,
    );
    await vi.waitUntil(() => !store.notifications.connected, { interval: 1 });
    const before = lookUps();
    for (let i = 0; i < 3; i += 1) await authenticator.authenticate(`Bearer ${token}`);
    expect(store.notifications.connected).toBe(false);
    expect(lookUps() - before).toBe(3);
    await vi.waitUntil(() => store.notifications.connected, { timeout: 10_000 });
    for (let i = 0; i < 3; i += 1) await authenticator.authenticate(`Bearer ${token}`);
    authenticator.close();
    expect(lookUps() - before).toBe(4);
  });
});

describe('rights', () => {
  const viewer = (role: Role): Viewer => ({
    ...admin,
    role,
    tokenId: 'own',
    actor: { ...admin.actor, id: 'me' },
  });
  const allowed = (action: Action) => ROLES.filter((role) => may(viewer(role), action));

  /** The table of the service's contract. */
  const TABLE: Readonly<Record<string, readonly Action[]>> = {
    'READER DESIGNER INSTRUMENT ADMIN': [
      'viewer.read',
      'service.read',
      'introspect',
      'chip.read',
      'configuration.read',
      'release.read',
      'design.read',
      'actor.read',
      'token.read',
      'token.revoke',
    ],
    'READER DESIGNER ADMIN': [
      'design.list',
      'design-request.read',
      'design-request.list',
      'specification.check',
      'history.read',
    ],
    'DESIGNER ADMIN': [
      'design.request',
      'design.cancel',
      'chip.register',
      'chip.revise',
      'version.save',
      'release.publish',
    ],
    ADMIN: ['token.list', 'token.create', 'metrics.read'],
  };

  it('[property] are given to exactly the roles of the contract, for every action', () => {
    for (const [roles, actions] of Object.entries(TABLE)) {
      for (const action of actions) expect([action, allowed(action).join(' ')]).toEqual([action, roles]);
    }
    expect(Object.values(TABLE).flat().sort()).toEqual(Object.keys(RIGHTS).sort());
  });

  it("[property] reach only one's own requests and tokens, except for ADMIN", () => {
    expect(may(viewer('DESIGNER'), 'design.cancel', { actorId: 'me' })).toBe(true);
    expect(may(viewer('DESIGNER'), 'design.cancel', { actorId: 'other' })).toBe(false);
    expect(may(viewer('ADMIN'), 'design.cancel', { actorId: 'other' })).toBe(true);
    expect(may(viewer('READER'), 'token.revoke', { tokenId: 'own' })).toBe(true);
    expect(may(viewer('READER'), 'token.revoke', { tokenId: 'other' })).toBe(false);
  });

  it('[property] that are missing are refused with the roles that have them', () => {
    const refuse = (action: Action, object?: { actorId: string }) => {
      try {
        authorise(viewer(object ? 'DESIGNER' : 'READER'), action, object);
      } catch (error) {
        return (error as ProblemError).problem;
      }
      return null;
    };
    expect(refuse('design.request')).toMatchObject({
      code: 'FORBIDDEN',
      status: 403,
      allowed: ['DESIGNER', 'ADMIN'],
    });
    expect(refuse('design.cancel', { actorId: 'other' })).toMatchObject({ allowed: ['ADMIN'] });
  });
});
