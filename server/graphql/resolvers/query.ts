/** Reading. */
import { viewerView } from '../../views/index.ts';
import type { GraphqlContext } from '../context.ts';
import { anyNode, chipNode, connection, designNode, historyNode, requestNode, tokenNode } from './nodes.ts';
import type { PageArgs, TypeResolvers } from './resolve.ts';

interface ListArgs extends PageArgs {
  readonly filter?: unknown;
  readonly order?: unknown;
}

export const Query: TypeResolvers = {
  me: (_: unknown, __: unknown, { operations, viewer }: GraphqlContext) => viewerView(operations.me(viewer)),
  service: (_: unknown, __: unknown, { operations, viewer }: GraphqlContext) => operations.service(viewer),
  async node(_: unknown, { id }: { id: string }, { operations, viewer }: GraphqlContext) {
    const found = await operations.node(viewer, id);
    return found && anyNode(found);
  },
  async chip(_: unknown, { serial }: { serial: string }, { operations, viewer }: GraphqlContext) {
    const found = await operations.findChip(viewer, serial);
    return found && chipNode(found);
  },
  chips(_: unknown, args: ListArgs, { operations, viewer }: GraphqlContext) {
    return connection(operations.listChips(viewer, args), chipNode);
  },
  async design(_: unknown, { id }: { id: string }, { operations, viewer }: GraphqlContext) {
    const found = await operations.findDesign(viewer, id);
    return found && designNode(found);
  },
  designs(_: unknown, args: ListArgs, { operations, viewer }: GraphqlContext) {
    return connection(operations.listDesigns(viewer, args), designNode);
  },
  async designRequest(_: unknown, { id }: { id: string }, { operations, viewer }: GraphqlContext) {
    const found = await operations.findRequest(viewer, id);
    return found && requestNode(found);
  },
  designRequests(_: unknown, args: ListArgs, { operations, viewer }: GraphqlContext) {
    return connection(operations.listRequests(viewer, args), requestNode);
  },
  checkSpecification(_: unknown, { input }: { input: unknown }, { operations, viewer }: GraphqlContext) {
    return operations.checkSpecification(viewer, input);
  },
  history(_: unknown, args: ListArgs, { operations, viewer }: GraphqlContext) {
    return connection(operations.listHistory(viewer, args), historyNode);
  },
  async tokens(_: unknown, __: unknown, { operations, viewer }: GraphqlContext) {
    return (await operations.listTokens(viewer)).map(tokenNode);
  },
};

export const Viewer: TypeResolvers = {
  actor: ({ actor }: { actor: object }) => ({ __typename: 'Actor', ...actor }),
};
