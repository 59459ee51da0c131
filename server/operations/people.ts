/** Tokens, history, and who asks. */
import { createTokenRule, revokeTokenRule } from '../../schema/library.ts';
import { historyFilterRule } from '../../schema/page.ts';
import { ENGINE_VERSION } from '../../src/conventions.ts';
import { actingOf, authorise, generateToken, may } from '../auth/index.ts';
import { badInput, notFound, refuse } from '../errors.ts';
import type { Context } from './context.ts';
import { uuidOfId } from './ids.ts';
import { connectionOf, readFilter } from './lists.ts';
import type { Operations } from './operations.ts';
import { readInput } from './read-input.ts';

type PeopleOperations = Pick<
  Operations,
  'me' | 'service' | 'listTokens' | 'createToken' | 'revokeToken' | 'listHistory' | 'actorsById'
>;

function expiryOf(text: string | undefined, now: number): Date | null {
  if (text === undefined) return null;
  const at = new Date(text);
  if (at.getTime() > now) return at;
  throw badInput('/expiresAt must lie in the future.', {
    pointer: '/expiresAt',
    given: text,
    allowed: { after: new Date(now).toISOString() },
  });
}

export function peopleOperations(context: Context): PeopleOperations {
  const { store, clock, version, limits } = context;
  return {
    me(viewer) {
      authorise(viewer, 'viewer.read');
      return viewer;
    },
    service(viewer) {
      authorise(viewer, 'service.read');
      return { version, engineVersion: ENGINE_VERSION, limits };
    },
    async listTokens(viewer) {
      authorise(viewer, 'token.list');
      return store.listTokens();
    },
    async createToken(viewer, body) {
      authorise(viewer, 'token.create');
      const { actor, role, label, ...input } = readInput(createTokenRule, body);
      const actorKind = input.actorKind ?? (role === 'INSTRUMENT' ? 'INSTRUMENT' : 'PERSON');
      if (actorKind === 'SYSTEM') {
        const allowed = ['PERSON', 'INSTRUMENT'];
        throw badInput('SYSTEM is the service itself; it has no tokens.', {
          pointer: '/actorKind',
          given: actorKind,
          allowed,
        });
      }
      const expiresAt = expiryOf(input.expiresAt, clock());
      const { token, lookup, secretHash } = generateToken();
      const ask = { actor, actorKind, role, label, expiresAt, lookup, secretHash };
      const made = await store.createToken(actingOf(viewer), ask);
      if (made.outcome === 'NAME_TAKEN') {
        const detail = `There is an actor ${actor} already, and it is no ${actorKind}.`;
        throw refuse('NAME_TAKEN', detail, { pointer: '/actor', given: actor });
      }
      return { record: made.record, secret: token };
    },
    async revokeToken(viewer, body) {
      const { id } = readInput(revokeTokenRule, body);
      const uuid = uuidOfId('tok', id);
      authorise(viewer, 'token.revoke', { tokenId: uuid ?? '' });
      const revoked = uuid === null ? null : await store.revokeToken(actingOf(viewer), uuid);
      if (revoked?.outcome === 'LAST_ADMIN') {
        const detail = 'This is the last valid ADMIN token; make another one first.';
        throw refuse('LAST_ADMIN', detail, { pointer: '/id', given: id });
      }
      if (revoked?.outcome !== 'WRITTEN') throw notFound('such token', '/id', id);
      return revoked.record;
    },
    async listHistory(viewer, ask) {
      authorise(viewer, 'history.read');
      const filter = readFilter(ask, historyFilterRule);
      const { action, after, before } = filter;
      const chip = filter.chip === undefined ? undefined : await context.chipBySerial(filter.chip);
      const actorId = filter.actor === undefined ? undefined : uuidOfId('act', filter.actor);
      if (actorId === null) throw notFound('such actor', '/actor', filter.actor);
      return connectionOf(ask, {
        context: { list: 'history', filter },
        read: (page) =>
          store.listHistory(
            {
              ...(chip === undefined ? {} : { chipId: chip.id }),
              ...(actorId === undefined ? {} : { actorId }),
              ...(action === undefined ? {} : { action }),
              ...(after === undefined ? {} : { after: new Date(after) }),
              ...(before === undefined ? {} : { before: new Date(before) }),
            },
            page,
          ),
        nodeOf: (row) => row,
      });
    },
    async actorsById(viewer, ids) {
      if (!may(viewer, 'actor.read') || ids.length === 0) return new Map();
      const actors = await store.findActors([...new Set(ids)]);
      return new Map(actors.map((actor) => [actor.id, actor]));
    },
  };
}
