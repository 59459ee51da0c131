/** Anything by its id. Each kind keeps its own right; what is unknown, malformed or hidden is null. */
import { may, type Viewer } from '../auth/index.ts';
import type { Context } from './context.ts';
import { historyNumberOfId, releaseKeyOfId, uuidOfId } from './ids.ts';
import type { NodeRecord, Operations } from './operations.ts';

type Found = Pick<
  Operations,
  | 'findRequest'
  | 'findDesign'
  | 'chipById'
  | 'revisionById'
  | 'configurationById'
  | 'versionById'
  | 'actorsById'
>;

type Type = NodeRecord['type'];
type RecordOf<T extends Type> = Extract<NodeRecord, { type: T }>['record'];

function nodeOf<T extends Type>(type: T, record: RecordOf<T> | null): NodeRecord | null {
  return record === null ? null : ({ type, record } as NodeRecord);
}

async function findRelease({ store }: Context, viewer: Viewer, id: string) {
  const key = releaseKeyOfId(id);
  if (key === null || !may(viewer, 'release.read')) return null;
  return store.findReleaseBySequence(key.chipId, key.name, key.sequence);
}

async function findToken({ store }: Context, viewer: Viewer, uuid: string) {
  return may(viewer, 'token.read', { tokenId: uuid }) ? store.findTokenById(uuid) : null;
}

async function findHistoryEntry({ store }: Context, viewer: Viewer, id: string) {
  const number = historyNumberOfId(id);
  return number !== null && may(viewer, 'history.read') ? store.findHistoryEntry(number) : null;
}

type Finder = (viewer: Viewer, id: string) => Promise<NodeRecord | null>;

/** One finder a prefix. */
export function nodeFinders(context: Context, found: Found): Readonly<Record<string, Finder>> {
  return {
    chp: async (viewer, id) => nodeOf('Chip', await found.chipById(viewer, uuidOfId('chp', id) ?? '')),
    rev: async (viewer, id) =>
      nodeOf('ChipRevision', await found.revisionById(viewer, uuidOfId('rev', id) ?? '')),
    req: async (viewer, id) => nodeOf('DesignRequest', await found.findRequest(viewer, id)),
    dsn: async (viewer, id) => nodeOf('Design', await found.findDesign(viewer, id)),
    cfg: async (viewer, id) =>
      nodeOf('Configuration', await found.configurationById(viewer, uuidOfId('cfg', id) ?? '')),
    ver: async (viewer, id) =>
      nodeOf('ConfigurationVersion', await found.versionById(viewer, uuidOfId('ver', id) ?? '')),
    rel: async (viewer, id) => nodeOf('Release', await findRelease(context, viewer, id)),
    act: async (viewer, id) => {
      const uuid = uuidOfId('act', id);
      const actors = uuid === null ? null : await found.actorsById(viewer, [uuid]);
      return nodeOf('Actor', actors?.get(uuid ?? '') ?? null);
    },
    tok: async (viewer, id) => nodeOf('Token', await findToken(context, viewer, uuidOfId('tok', id) ?? '')),
    hst: async (viewer, id) => nodeOf('HistoryEntry', await findHistoryEntry(context, viewer, id)),
  };
}
