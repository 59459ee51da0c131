/** Watching: the present state first, then every change. */
import { DEFAULT_RELEASE } from '../../../schema/library.ts';
import { notFound } from '../../errors.ts';
import { type DesignRequest, releaseId } from '../../operations/index.ts';
import type { ReleaseRecord } from '../../store/records.ts';
import type { GraphqlContext } from '../context.ts';
import { type Watch, watch } from '../watch.ts';
import { releaseNode, requestNode } from './nodes.ts';
import type { TypeResolvers } from './resolve.ts';

function watchRequest({ operations, viewer }: GraphqlContext, found: DesignRequest): Watch<DesignRequest> {
  const isLive = ({ state }: DesignRequest): boolean => state === 'QUEUED' || state === 'RUNNING';
  let told: string | null = null;
  return {
    concerns: (event) => event.kind === 'COMPUTATION' && event.id === found.computationId,
    async read() {
      const now = await operations.findRequest(viewer, found.id);
      if (now === null) return { news: [], isFinal: true };
      const state = `${now.state} ${now.progress}`;
      const isNews = state !== told;
      told = state;
      return { news: isNews ? [now] : [], isFinal: !isLive(now) };
    },
  };
}

/** Publications that are told one by one after an outage; what is older is passed over. */
const CAUGHT_UP = 100;

function watchRelease(context: GraphqlContext, serial: string, name: string): Watch<ReleaseRecord> {
  const { operations, viewer } = context;
  let told: number | null = null;

  /** Those between the last one told and the present one, which is told in any case. */
  async function missed(present: ReleaseRecord, after: number): Promise<ReleaseRecord[]> {
    const { chipId, sequence } = present;
    const first = Math.max(after + 1, sequence - CAUGHT_UP);
    const found: ReleaseRecord[] = [];
    for (let number = first; number < sequence; number++) {
      const node = await operations.node(viewer, releaseId({ chipId, name, sequence: number }));
      if (node?.type === 'Release') found.push(node.record);
    }
    return found;
  }

  return {
    concerns: (event) => event.kind === 'RELEASE' && event.chipSerial === serial && event.name === name,
    async read() {
      const present = await operations.findRelease(viewer, serial, name);
      const after = told ?? (present === null ? 0 : present.sequence - 1);
      const news = present && present.sequence > after ? [...(await missed(present, after)), present] : [];
      told = present?.sequence ?? 0;
      return { news, isFinal: false };
    },
  };
}

export const Subscription: TypeResolvers = {
  designRequestChanged: {
    async subscribe(_: unknown, { id }: { id: string }, context: GraphqlContext) {
      const found = await context.operations.findRequest(context.viewer, id);
      if (found === null) throw notFound('such design request', '/id', id);
      return watch(context.notifications, watchRequest(context, found));
    },
    resolve(request: DesignRequest, _: unknown, context: GraphqlContext) {
      context.renew();
      return requestNode(request);
    },
  },
  releasePublished: {
    async subscribe(_: unknown, args: { chip: string; name?: string | null }, context: GraphqlContext) {
      const chip = await context.operations.findChip(context.viewer, args.chip);
      if (chip === null) throw notFound(`chip ${args.chip}`, '/chip', args.chip);
      return watch(context.notifications, watchRelease(context, chip.serial, args.name ?? DEFAULT_RELEASE));
    },
    resolve(release: ReleaseRecord, _: unknown, context: GraphqlContext) {
      context.renew();
      return releaseNode(release);
    },
  },
};
